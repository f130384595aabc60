/**
 * The words of the domain as schemas and types: Plan, Estimation, Candidate, Change, LadderPlan, Rules.
 *
 * These are the plain values that cross every boundary (plan file, project file, window); each is validated by
 * its schema where it enters. Names of indicators, factors, groups and candidates are the user's own text.
 */
import { z } from 'zod'
import type { Caution } from '../statistics/fit/fit-result.ts'
import { type CellPart, cellParts } from '../statistics/model/cells.ts'

export type { Caution } from '../statistics/fit/fit-result.ts'
export type { CellPart } from '../statistics/model/cells.ts'

const name = z.string().trim().min(1)

export const cellPartSchema = z.enum(cellParts)

/** Which names a cell of each part takes, in order. */
export const kindsOfPart: Readonly<Record<CellPart, readonly ('indicator' | 'factor')[]>> = {
  loading: ['indicator', 'factor'],
  'residual variance': ['indicator'],
  'residual covariance': ['indicator', 'indicator'],
  'factor variance': ['factor'],
  'factor covariance': ['factor', 'factor'],
  intercept: ['indicator'],
  'factor mean': ['factor'],
  'factor regression': ['factor', 'factor']
}

/** How many names a cell of each part takes: one (an indicator or factor) or two. */
export const namesOfPart: Readonly<Record<CellPart, 1 | 2>> = {
  loading: 2,
  'residual variance': 1,
  'residual covariance': 2,
  'factor variance': 1,
  'factor covariance': 2,
  intercept: 1,
  'factor mean': 1,
  'factor regression': 2
}

/** One cell of a model, e.g. loading [indicator, factor] or factor regression [outcome, predictor]. */
export const cellNameSchema = z.strictObject({ part: cellPartSchema, of: z.array(name).min(1).max(2) })
export type CellName = z.infer<typeof cellNameSchema>

/** What can be held equal across groups as a whole. */
export const equalSets = [
  'loadings',
  'intercepts',
  'residual variances',
  'residual covariances',
  'factor variances',
  'factor covariances',
  'factor means'
] as const
export const equalSetSchema = z.enum(equalSets)
export type EqualSet = z.infer<typeof equalSetSchema>

/** The set of `equal across groups` that each kind of cell belongs to; a factor's regressions are its loadings of second order. */
export const setOfPart: Readonly<Record<CellPart, EqualSet>> = {
  loading: 'loadings',
  'factor regression': 'loadings',
  intercept: 'intercepts',
  'residual variance': 'residual variances',
  'residual covariance': 'residual covariances',
  'factor variance': 'factor variances',
  'factor covariance': 'factor covariances',
  'factor mean': 'factor means'
}

/** One term of a linear constraint: `times` the cell; `group` null means the group the constraint stands in. */
export const constraintTermSchema = z.strictObject({
  cell: cellNameSchema,
  times: z.number().default(1),
  group: name.nullable().default(null)
})
export type ConstraintTerm = z.infer<typeof constraintTermSchema>

/**
 * One change that turns a parent into a derived candidate. Without `group` it acts in every group.
 * `free` also takes the cell out of any equality, constraint and bound before it; `fix` fixes that cell alone; `equal` ties the
 * cells together within each group; `constrain` makes the sum of times x cell equal `to`, within each group or, where every
 * term names its group, across groups; `bound` keeps a free cell at or above `atLeast`, at or below `atMost`.
 */
export const changeSchema = z.discriminatedUnion('do', [
  z.strictObject({ do: z.literal('free'), cell: cellNameSchema, group: name.nullable().default(null) }),
  z.strictObject({ do: z.literal('fix'), cell: cellNameSchema, at: z.number(), group: name.nullable().default(null) }),
  z.strictObject({ do: z.literal('equal'), cells: z.array(cellNameSchema).min(2), group: name.nullable().default(null) }),
  z.strictObject({
    do: z.literal('constrain'),
    terms: z.array(constraintTermSchema).min(2),
    to: z.number(),
    group: name.nullable().default(null)
  }),
  z.strictObject({
    do: z.literal('bound'),
    cell: cellNameSchema,
    atLeast: z.number().nullable().default(null),
    atMost: z.number().nullable().default(null),
    group: name.nullable().default(null)
  })
])
export type Change = z.infer<typeof changeSchema>

export const scalings = ['first loading', 'factor variance', 'effects coding'] as const
export const scalingSchema = z.enum(scalings)
export type Scaling = z.infer<typeof scalingSchema>

/** A cell released from `equal across groups`, in one group or (null) in all of them. */
export const releaseSchema = z.strictObject({ cell: cellNameSchema, group: name.nullable().default(null) })
export type Release = z.infer<typeof releaseSchema>

/** A factor and what it measures: indicators, or other factors (second order). */
export const factorSchema = z.strictObject({ name, measures: z.array(name).min(1) })
export type Factor = z.infer<typeof factorSchema>

/**
 * A model in the family, as the user states it. `from` null: `factors` is given and what is null below takes its
 * default (scaling first loading, factor covariances free, not across groups). `from` a candidate's name: `factors` is
 * null, what is null is the parent's, `except` and `change` come after the parent's own, in order.
 */
export const candidateSchema = z.strictObject({
  name,
  from: name.nullable().default(null),
  factors: z.array(factorSchema).min(1).nullable().default(null),
  scaling: scalingSchema.nullable().default(null),
  factorCovariances: z.enum(['free', 'zero']).nullable().default(null),
  across: name.nullable().default(null),
  equalAcrossGroups: z.array(equalSetSchema).nullable().default(null),
  except: z.array(releaseSchema).default([]),
  change: z.array(changeSchema).default([])
})
export type Candidate = z.infer<typeof candidateSchema>

/** Whether a candidate was in the plan before the first fit, or came after results were seen. */
export type Origin = 'planned' | 'added after results'

export const invarianceLevels = ['configural', 'metric', 'scalar', 'strict'] as const
export const invarianceLevelSchema = z.enum(invarianceLevels)
export type InvarianceLevel = z.infer<typeof invarianceLevelSchema>

/** What can be held equal on top of a level of invariance, each by itself: the structure rather than the measurement. */
export const structuralSets = ['factor variances', 'factor covariances', 'factor means'] as const
export type StructuralSet = (typeof structuralSets)[number]

/** One occasion of measurement in wide data, and the indicators as they are called there. */
const occasionSchema = z.strictObject({ name, indicators: z.array(name).min(1) })

/**
 * An ordered chain of candidates, bottom (least restrictive) first: listed, or generated from one candidate, across groups
 * or over occasions (the candidate describes the first; all list the same indicators in the same order). What `and` names
 * is added to the highest level, each by itself, as a ladder of two rungs of its own.
 */
export const ladderPlanSchema = z.union([
  z.strictObject({ name, rungs: z.array(name).min(1) }),
  z.strictObject({
    name,
    invarianceOf: name,
    across: name,
    through: invarianceLevelSchema,
    and: z.array(z.enum(structuralSets)).min(1).optional()
  }),
  z.strictObject({ name, invarianceOf: name, over: z.array(occasionSchema).min(2), through: invarianceLevelSchema })
])
export type LadderPlan = z.infer<typeof ladderPlanSchema>

export const estimationSchema = z.strictObject({
  method: z.literal('maximum likelihood').default('maximum likelihood'),
  /** normal: T = sum n_g F_g, S of divisor n. wishart: T = sum (n_g - 1) F_g, S of divisor n - 1, covariances only. */
  convention: z.enum(['normal', 'wishart']).default('normal'),
  statistic: z.enum(['normal theory', 'mean-scaled']).default('normal theory'),
  missing: z.enum(['complete cases', 'full information']).default('complete cases'),
  standardErrors: z.enum(['expected', 'observed', 'robust']).default('expected')
})
export type Estimation = z.infer<typeof estimationSchema>

/** Published rules of thumb that can be named in place of thresholds (rule-presets.ts). */
export const presets = ['Cheung & Rensvold 2002', 'Chen 2007', 'Meade, Johnson & Braddy 2008'] as const
const presetSchema = z.enum(presets)

/** The criteria fixed before fitting. A change in fit holds while no given threshold is crossed (methods: section 7). */
export const rulesSchema = z.strictObject({
  alpha: z.number().gt(0).lt(1).default(0.05),
  adjust: z.enum(['holm', 'none']).default('holm'),
  changeInFit: z
    .strictObject({
      /** A published rule by its citation; its thresholds then count, and those below are null. */
      preset: presetSchema.nullable().default(null),
      /** Lowest Delta CFI that still holds, e.g. -0.01. */
      cfi: z.number().max(0).nullable().default(null),
      /** Highest Delta RMSEA that still holds, e.g. 0.015. */
      rmsea: z.number().min(0).nullable().default(null),
      /** Highest Delta SRMR that still holds. */
      srmr: z.number().min(0).nullable().default(null),
      /** Lowest Delta of McDonald's centrality that still holds. */
      mcdonald: z.number().max(0).nullable().default(null),
      /** Lowest Delta gamma-hat that still holds. */
      gammaHat: z.number().max(0).nullable().default(null)
    })
    .nullable()
    .default(null),
  decideBy: z.enum(['difference test', 'change in fit', 'both']).default('difference test'),
  /** Of scaled statistics: Satorra & Bentler 2001 where it is defined, or always the strictly positive form of 2010. */
  scaledDifference: z.enum(['ordinary', 'strictly positive']).default('ordinary')
})
export type Rules = z.infer<typeof rulesSchema>

/** Where a plan's data come from, as the user states it. `file` is relative to the plan. */
export const dataPlanSchema = z.union([
  z.strictObject({
    kind: z.literal('file'),
    file: name,
    indicators: z.array(name).min(1),
    group: name.nullable().default(null),
    missingCodes: z.array(z.string()).default(['', 'NA'])
  }),
  z.strictObject({
    kind: z.literal('summary'),
    indicators: z.array(name).min(1),
    divisor: z.enum(['n', 'n-1']),
    /** Name of the grouping, what `across` refers to; "group" unless the plan says otherwise. */
    group: name.default('group'),
    groups: z
      .array(
        z.strictObject({
          name: name.nullable(),
          n: z.number(),
          /** Lower triangle by rows, of the covariances (with sd null) or of the correlations. */
          lower: z.array(z.array(z.number())),
          sd: z.array(z.number()).nullable(),
          mean: z.array(z.number()).nullable()
        })
      )
      .min(1)
  })
])
export type DataPlan = z.infer<typeof dataPlanSchema>

/** A whole study as its plan file says it. */
export const planSchema = z.strictObject({
  study: name,
  data: dataPlanSchema,
  estimation: estimationSchema,
  candidates: z.array(candidateSchema),
  ladders: z.array(ladderPlanSchema),
  rules: rulesSchema
})
export type Plan = z.infer<typeof planSchema>

/** One group's rows: `values` is n x p row-major, NaN where the answer is missing. */
export interface RowGroup {
  name: string | null
  n: number
  values: Float64Array
}

/** One group's published moments: `covariance` p x p row-major with the data set's divisor, `mean` of length p or null. */
export interface SummaryGroup {
  name: string | null
  n: number
  covariance: Float64Array
  mean: Float64Array | null
}

interface DataSetBase {
  /** "sha256:" and 64 hex digits over indicators, groups and every value. */
  digest: string
  /** What the user called it: the file's name, or "published summary". */
  source: string
  indicators: string[]
  /** The grouping column's name; null when there is one group. */
  grouping: string | null
  /** What was found while reading that the user should know; nothing is repaired silently. */
  cautions: Caution[]
}
/** Typed data, checked, in the order of the file; groups in order of first appearance. */
export type DataSet =
  | (DataSetBase & { kind: 'rows'; groups: RowGroup[] })
  | (DataSetBase & { kind: 'summary'; divisor: 'n' | 'n-1'; groups: SummaryGroup[] })
