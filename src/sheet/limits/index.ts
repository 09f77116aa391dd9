/** Limits: a table of them or a column of the holdings -> limits; limits and the figures of a book -> how they stand. */
export { LIMIT_MEASURES, LIMIT_STATUS, limitOn, limitsSummary, limitText } from './limit'
export type { Limit, LimitMeasure, LimitScope, LimitState, LimitStatus } from './limit'
export { judgeLimits } from './judging'
export { columnLimits, limitsOf, readLimits } from './reading'
export type { LimitsReading } from './reading'
