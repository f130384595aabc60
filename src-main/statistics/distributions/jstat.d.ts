/** The few calls of jstat that the tests compare against; the package has no types of its own. */
declare module 'jstat' {
  const jStat: {
    gammaln(x: number): number
    chisquare: { cdf(x: number, df: number): number; inv(p: number, df: number): number }
    normal: { cdf(x: number, mean: number, deviation: number): number }
  }
  export default jStat
}
