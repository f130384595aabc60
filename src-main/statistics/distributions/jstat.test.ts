import jStat from 'jstat'
import { describe, expect, test } from 'vitest'
import reference from '../../../fixtures/distributions.json' with { type: 'json' }
import { chiSquareLower, chiSquareQuantile, chiSquareUpper } from './chi-square.ts'
import { logGamma } from './gamma.ts'
import { normalUpper } from './normal.ts'
import { relativeError } from './relative-error.ts'

const STANDARD = 1e-10

/** Why the tails here are not the library's: each figure below is beyond the standard there and within it here. */
describe('the library falls short of the numerical standard where tails matter', () => {
  test('its upper tail is 1 - cdf, which loses every digit', () => {
    const [df, x, upper] = reference.central.find(([f, at]) => f === 10 && at === 100)!
    expect(upper).toBeLessThan(1e-15)
    expect(relativeError(1 - jStat.chisquare.cdf(x!, df!), upper!)).toBeGreaterThan(STANDARD)
    expect(relativeError(chiSquareUpper(x!, df!), upper!)).toBeLessThan(STANDARD)
  })

  test('its lower tail at 1000 degrees of freedom is off by more than 1e-10', () => {
    const [df, x, , lower] = reference.central.find(([f, at]) => f === 1000 && at === 250)!
    expect(relativeError(jStat.chisquare.cdf(x!, df!), lower!)).toBeGreaterThan(STANDARD)
    expect(relativeError(chiSquareLower(x!, df!), lower!)).toBeLessThan(STANDARD)
  })

  test('its log-gamma at 1000 is off by more than 1e-10, and so would be any tail built on it', () => {
    const [x, value] = reference.logGamma.find(([at]) => at === 1000)!
    expect(Math.abs(jStat.gammaln(x!) - value!)).toBeGreaterThan(STANDARD)
    expect(Math.abs(logGamma(x!) - value!)).toBeLessThan(1e-11)
  })

  test('it has no critical value for a tail below 1e-16', () => {
    const tail = 1e-20
    const library = jStat.chisquare.inv(1 - tail, 10)
    expect(relativeError(chiSquareUpper(library, 10), tail)).toBeGreaterThan(STANDARD)
    expect(relativeError(chiSquareUpper(chiSquareQuantile(tail, 10), 10), tail)).toBeLessThan(STANDARD)
  })

  test('its normal upper tail at 12 is nothing', () => {
    const [z, upper] = reference.normal.find(([at]) => at === 12)!
    expect(relativeError(1 - jStat.normal.cdf(z!, 0, 1), upper!)).toBeGreaterThan(STANDARD)
    expect(relativeError(normalUpper(z!), upper!)).toBeLessThan(STANDARD)
  })
})
