/**
 * Float64 columns as bytes and back: IEEE 754 doubles, little-endian whatever the machine, NaN as one bit pattern.
 */

const bytesOfDouble = 8

export function toBytes(values: Float64Array): Uint8Array {
  const bytes = new Uint8Array(values.length * bytesOfDouble)
  const view = new DataView(bytes.buffer)
  for (let i = 0; i < values.length; i++)
    view.setFloat64(i * bytesOfDouble, Number.isNaN(values[i]) ? Number.NaN : values[i]!, true)
  return bytes
}

/** @throws RangeError when the length is not a whole number of doubles: the caller says which stored value that was. */
export function fromBytes(bytes: Uint8Array): Float64Array {
  if (bytes.byteLength % bytesOfDouble !== 0) throw new RangeError(`${bytes.byteLength} bytes are not a whole number of doubles`)
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength)
  const values = new Float64Array(bytes.byteLength / bytesOfDouble)
  for (let i = 0; i < values.length; i++) values[i] = view.getFloat64(i * bytesOfDouble, true)
  return values
}
