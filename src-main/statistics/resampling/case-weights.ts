/**
 * Resampling of cases with replacement (the non-parametric bootstrap; Efron 1979), within strata: every stratum keeps its
 * size. A resample is a whole-number weight a case, which says how often the case was drawn.
 */
import { type Generator, seededGenerator } from '../distributions/generator.ts'

/** A large odd number, so that the resamples of neighbouring seeds have nothing in common. */
const stride = 0x632be5ab

/** The generator of resample number `index` (from 0): it depends on nothing but the two, whichever thread draws it. */
export function resampleGenerator(seed: number, index: number): Generator {
  return seededGenerator((seed + Math.imul(index + 1, stride)) | 0)
}

/**
 * @param strata cases in each stratum; the cases of one stand together, stratum after stratum
 * @param weights as long as all strata together, written: in each stratum they sum to its size
 */
export function drawWeights(strata: readonly number[], generator: Generator, weights: Int32Array): void {
  weights.fill(0)
  let start = 0
  for (const size of strata) {
    for (let draw = 0; draw < size; draw++) weights[start + Math.floor(generator.uniform() * size)]! += 1
    start += size
  }
}
