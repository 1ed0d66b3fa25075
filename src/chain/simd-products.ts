/**
 * The inner product kernel of a dense elimination as a WebAssembly program of four rows by four columns, two doubles an
 * instruction. Every entry gets its products in the order of the pivots, each rounded twice, so the digits are those of
 * the plain loop.
 *
 * The program is assembled here, instruction by instruction: it is one short loop, and no compiler has to be installed.
 * Numbers are those of the WebAssembly core specification 2.0, with its vector instructions.
 */
export interface SimdProducts {
  /** A matrix of zeros in the program's memory, length entries; the one given out before is lost. */
  matrix(entries: number): Float64Array
  /**
   * a_ij += Σ_q a_iq a_qj as in `addProducts` of the dense elimination, for whole blocks of four by four.
   * @returns false where `a` does not lie in the program's memory
   */
  add(a: Float64Array, size: number, first: number, width: number, rows: number, columns: number): boolean
}

const pageBytes = 65536
const instruction = {
  block: [0x02, 0x40],
  loop: [0x03, 0x40],
  end: [0x0b],
  branch: (depth: number) => [0x0c, depth],
  branchIf: (depth: number) => [0x0d, depth],
  get: (local: number) => [0x20, local],
  set: (local: number) => [0x21, local],
  constant: (value: number) => [0x41, value], // 0 … 63: one byte, signed
  addInteger: [0x6a],
  subtractInteger: [0x6b],
  isZero: [0x45],
  loadPair: (offset: number) => [0xfd, 0x00, 3, offset],
  loadTwice: (offset: number) => [0xfd, 0x0a, 3, offset],
  storePair: (offset: number) => [0xfd, 0x0b, 3, offset],
  addPairs: [0xfd, 0xf0, 0x01],
  multiplyPairs: [0xfd, 0xf2, 0x01],
} as const

/** products(entries, stride, blocks, width, shares, packed): addresses and counts, stride in bytes. */
function program(): number[] {
  const { block, loop, end, branch, branchIf, get, set, constant, addInteger, subtractInteger, isZero } = instruction
  const { loadPair, loadTwice, storePair, addPairs, multiplyPairs } = instruction
  const [entries, stride, blocks, width, shares, packed, left] = [0, 1, 2, 3, 4, 5, 6]
  const share = [7, 8, 9, 10]
  const at = 11
  const row = [entries, 12, 13, 14]
  const sum = (i: number, half: number) => 15 + 2 * i + half
  const pivot = [23, 24]
  const twice = 25
  const increase = (local: number, by: readonly number[]) => [...get(local), ...by, ...addInteger, ...set(local)]
  const decrease = (local: number) => [...get(local), ...constant(1), ...subtractInteger, ...set(local)]
  const four = [0, 1, 2, 3]
  const body = [
    ...block,
    ...loop,
    ...[...get(blocks), ...isZero, ...branchIf(1)],
    ...[1, 2, 3].flatMap((i) => [...get(row[i - 1]), ...get(stride), ...addInteger, ...set(row[i])]),
    ...four.flatMap((i) => [0, 1].flatMap((half) => [...get(row[i]), ...loadPair(16 * half), ...set(sum(i, half))])),
    ...[...get(shares), ...set(share[0])],
    ...[1, 2, 3].flatMap((i) => [...get(share[i - 1]), ...get(stride), ...addInteger, ...set(share[i])]),
    ...[...get(packed), ...set(at), ...get(width), ...set(left)],
    ...loop,
    ...[0, 1].flatMap((half) => [...get(at), ...loadPair(16 * half), ...set(pivot[half])]),
    ...four.flatMap((i) => [
      ...[...get(share[i]), ...loadTwice(0), ...set(twice)],
      ...[0, 1].flatMap((half) => [
        ...[...get(sum(i, half)), ...get(twice), ...get(pivot[half]), ...multiplyPairs, ...addPairs],
        ...set(sum(i, half)),
      ]),
      ...increase(share[i], constant(8)),
    ]),
    ...increase(at, constant(32)),
    ...decrease(left),
    ...[...get(left), ...branchIf(0)],
    ...end,
    ...four.flatMap((i) => [0, 1].flatMap((half) => [...get(row[i]), ...get(sum(i, half)), ...storePair(16 * half)])),
    ...[...get(row[3]), ...get(stride), ...addInteger, ...set(entries)],
    ...four.flatMap(() => increase(shares, get(stride))),
    ...decrease(blocks),
    ...branch(0),
    ...end,
    ...end,
  ]
  return [2, 9, 0x7f, 11, 0x7b, ...body, ...end] // locals: nine integers, eleven pairs
}

const unsigned = (value: number): number[] => (value < 128 ? [value] : [(value & 127) | 128, ...unsigned(value >>> 7)])

function assemble(): Uint8Array {
  const text = (name: string) => [name.length, ...Array.from(name, (letter) => letter.charCodeAt(0))]
  const section = (id: number, content: readonly number[]) => [id, ...unsigned(content.length), ...content]
  const code = program()
  return Uint8Array.from([
    ...[0, 0x61, 0x73, 0x6d, 1, 0, 0, 0],
    ...section(1, [1, 0x60, 6, 0x7f, 0x7f, 0x7f, 0x7f, 0x7f, 0x7f, 0]),
    ...section(2, [1, ...text('own'), ...text('memory'), 2, 0, 1]),
    ...section(3, [1, 0]),
    ...section(7, [1, ...text('products'), 0, 0]),
    ...section(10, [1, ...unsigned(code.length), ...code]),
  ])
}

/** Rows that are taken through all columns together: their shares stay in the fastest cache. */
const rowsTogether = 128

/** What is used of the engine's own interface, which the type library for Node leaves out. */
declare const WebAssembly: {
  validate(bytes: Uint8Array): boolean
  Module: new (bytes: Uint8Array) => object
  Memory: new (size: { initial: number }) => { readonly buffer: ArrayBuffer; grow(pages: number): number }
  Instance: new (module: object, imports: object) => { readonly exports: Record<string, unknown> }
}

/** A kernel with a memory of its own; undefined where the engine has no vector instructions. */
export function simdProducts(): SimdProducts | undefined {
  const bytes = assemble()
  if (!WebAssembly.validate(bytes)) return undefined
  const memory = new WebAssembly.Memory({ initial: 1 })
  const instance = new WebAssembly.Instance(new WebAssembly.Module(bytes), { own: { memory } })
  const products = instance.exports.products as (...addresses: number[]) => void
  let packedAt = 0 // entries: behind the matrix
  return {
    matrix(entries) {
      // Behind the matrix: a panel's pivot rows, packed, never more than 64 of the longest row there can be.
      const panel = 64 * (Math.ceil(Math.sqrt(entries)) + 4)
      const missing = 8 * (entries + panel + 2) - memory.buffer.byteLength
      if (missing > 0) memory.grow(Math.ceil(missing / pageBytes))
      packedAt = entries + (entries & 1)
      return new Float64Array(memory.buffer, 0, entries).fill(0)
    },
    add(a, size, first, width, rows, columns) {
      if (a.buffer !== memory.buffer) return false
      const columnBlocks = (size - columns) >> 2
      const rowBlocks = (size - rows) >> 2
      const packed = new Float64Array(memory.buffer, 8 * packedAt, 4 * width * columnBlocks)
      for (let block = 0, at = 0; block < columnBlocks; block++) {
        for (let q = 0; q < width; q++, at += 4) {
          const from = (first + q) * size + columns + 4 * block
          packed[at] = a[from]
          packed[at + 1] = a[from + 1]
          packed[at + 2] = a[from + 2]
          packed[at + 3] = a[from + 3]
        }
      }
      const stride = 8 * size
      for (let done = 0; done < rowBlocks; done += rowsTogether / 4) {
        const blocks = Math.min(rowsTogether / 4, rowBlocks - done)
        const row = (rows + 4 * done) * size
        for (let block = 0; block < columnBlocks; block++) {
          const entries = 8 * (row + columns + 4 * block)
          products(entries, stride, blocks, width, 8 * (row + first), 8 * (packedAt + 4 * width * block))
        }
      }
      return true
    },
  }
}
