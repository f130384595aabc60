/** How the benchmarks measure: medians of repeats, beside a plain reference loop timed in the same run. */

export interface Timing {
  name: string
  /** Milliseconds. */
  median: number
  /** The fastest repeat: what the median would be on a machine that does nothing else. */
  fastest: number
  target: number | null
}

export function median(values: number[]): number {
  const sorted = [...values].sort((a, b) => a - b)
  return (sorted[Math.floor((sorted.length - 1) / 2)]! + sorted[Math.ceil((sorted.length - 1) / 2)]!) / 2
}

/** Median milliseconds of `work` after a warm-up of a fifth of the repeats. */
export function time(name: string, repeats: number, target: number | null, work: () => unknown): Timing {
  for (let i = 0; i < Math.ceil(repeats / 5); i++) work()
  const times: number[] = []
  for (let i = 0; i < repeats; i++) {
    const start = performance.now()
    work()
    times.push(performance.now() - start)
  }
  return { name, median: median(times), fastest: Math.min(...times), target }
}

const a = Float64Array.from({ length: 1000 }, (_, i) => Math.sin(i))
const b = Float64Array.from({ length: 1000 }, (_, i) => Math.cos(i))

/** One million multiply-adds of a dot product over 1,000 numbers: what this machine does with the simplest loop there is. */
export function referenceLoop(): number {
  let sum = 0
  for (let round = 0; round < 1000; round++) for (let i = 0; i < 1000; i++) sum += a[i]! * b[i]!
  return sum
}

/** Least-squares slope of log time on log size: the power with which time grows. */
export function exponent(sizes: readonly number[], times: readonly number[]): number {
  const x = sizes.map(Math.log)
  const y = times.map(Math.log)
  const middle = (values: number[]) => values.reduce((sum, value) => sum + value, 0) / values.length
  const [mx, my] = [middle(x), middle(y)]
  const across = x.reduce((sum, value, i) => sum + (value - mx) * (y[i]! - my), 0)
  return across / x.reduce((sum, value) => sum + (value - mx) ** 2, 0)
}
