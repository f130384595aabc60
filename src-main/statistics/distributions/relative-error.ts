/** |got - wanted| / |wanted|; the absolute error where the truth is 0. For tests; NaN and infinities give infinity, so they fail. */
export function relativeError(got: number, wanted: number): number {
  const error = wanted === 0 ? Math.abs(got) : Math.abs(got - wanted) / Math.abs(wanted)
  return Number.isNaN(error) ? Number.POSITIVE_INFINITY : error
}

/** The largest error over a table; infinity for an empty table, which would prove nothing. */
export function worst<Row>(rows: readonly Row[], error: (row: Row) => number): number {
  return rows.length === 0 ? Number.POSITIVE_INFINITY : Math.max(...rows.map(error))
}
