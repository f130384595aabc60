/**
 * A seeded generator of uniform and normal draws, passed in wherever chance is needed, so that every result can be repeated.
 *
 * Uniform: xoshiro128** (Blackman & Vigna 2021), seeded by SplitMix32; 32 bits a draw, two draws a double of 53 bits.
 */
export interface Generator {
  /** Uniform on [0, 1). */
  uniform(): number
  /** Standard normal (Marsaglia's polar method). */
  normal(): number
}

export function seededGenerator(seed: number): Generator {
  const state = seedState(seed)
  const next = (): number => {
    const result = Math.imul(rotate(Math.imul(state[1]!, 5), 7), 9) >>> 0
    const shifted = state[1]! << 9
    state[2]! ^= state[0]!
    state[3]! ^= state[1]!
    state[1]! ^= state[2]!
    state[0]! ^= state[3]!
    state[2]! ^= shifted
    state[3] = rotate(state[3]!, 11)
    return result
  }
  const uniform = () => ((next() >>> 5) * 67108864 + (next() >>> 6)) / 9007199254740992
  return { uniform, normal: () => polarNormal(uniform) }
}

function rotate(x: number, bits: number): number {
  return (x << bits) | (x >>> (32 - bits))
}

function seedState(seed: number): Int32Array {
  const state = new Int32Array(4)
  let x = seed | 0
  for (let i = 0; i < 4; i++) {
    x = (x + 0x9e3779b9) | 0
    let z = x
    z = Math.imul(z ^ (z >>> 16), 0x21f0aaad)
    z = Math.imul(z ^ (z >>> 15), 0x735a2d97)
    state[i] = z ^ (z >>> 15)
  }
  return state
}

function polarNormal(uniform: () => number): number {
  for (;;) {
    const a = 2 * uniform() - 1
    const b = 2 * uniform() - 1
    const square = a * a + b * b
    if (square > 0 && square < 1) return a * Math.sqrt((-2 * Math.log(square)) / square)
  }
}
