import { closeSync, openSync, readSync } from 'node:fs'

/** Bytes of a file in which an offending line is looked for; a scenario has fewer, a matrix may have more. */
const lookedAt = 16 * 2 ** 20

/** A line (from 1) of a file as it stands, undefined where it can't be read or lies further down than is looked. */
export function sourceLine(file: string, line: number): string | undefined {
  try {
    const handle = openSync(file, 'r')
    try {
      const bytes = Buffer.alloc(lookedAt)
      const count = readSync(handle, bytes, 0, lookedAt, 0)
      return bytes
        .toString('utf8', 0, count)
        .replace(/^\uFEFF/, '')
        .split(/\r\n|\n|\r/)[line - 1]
    } finally {
      closeSync(handle)
    }
  } catch {
    return undefined // a pipe, or a file that is gone by now: the message does without its line
  }
}
