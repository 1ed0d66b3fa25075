import { createHash } from 'node:crypto'
import { readFileSync } from 'node:fs'
import { open } from 'node:fs/promises'
import { dirname, resolve } from 'node:path'
import { StillmarkError } from '../errors/stillmark-error.js'
import { parseScenario } from './parse-scenario.js'
import type { Scenario } from './scenario.js'

/** Larger files are no scenarios. Matrices beside a scenario may be larger. */
const largestFile = 16 * 2 ** 20
const largestMatrix = 512 * 2 ** 20

/**
 * Reads and checks a scenario file; a matrix it names is looked for in its folder.
 *
 * @param overrides constants set from outside, as written there
 * @throws StillmarkError no-file, not-a-file, not-readable, too-large, not-utf-8, and all that `parseScenario` finds
 */
export async function readScenario(
  file: string,
  options: { readonly overrides?: ReadonlyMap<string, string> } = {},
): Promise<Scenario> {
  const bytes = await contentOf(file)
  let text: string
  try {
    text = new TextDecoder('utf-8', { fatal: true }).decode(bytes)
  } catch {
    throw unusable('not-utf-8', file, 'The file is not text in UTF-8.', 'Save it as UTF-8.')
  }
  return parseScenario(text, {
    file,
    overrides: options.overrides,
    sha256: createHash('sha256').update(bytes).digest('hex'),
    readBeside: (name) => besides(file, name),
  })
}

async function contentOf(file: string): Promise<Uint8Array> {
  let handle: Awaited<ReturnType<typeof open>>
  try {
    handle = await open(file, 'r')
  } catch (error) {
    const { code } = error as NodeJS.ErrnoException
    if (code === 'ENOENT' || code === 'ENOTDIR')
      throw unusable('no-file', file, 'There is no such file.', 'Check the name and the folder.')
    throw unusable('not-readable', file, `The file can't be opened (${code}).`, 'Check its permissions.')
  }
  try {
    const { size, ...about } = await handle.stat()
    if ((about.mode & 0o170000) === 0o040000)
      throw unusable('not-a-file', file, 'This is a folder.', 'Name the scenario file in it.')
    if (size > largestFile)
      throw unusable(
        'too-large',
        file,
        `The file has ${(size / 2 ** 20).toFixed(0)} MB.`,
        'A scenario has at most 16 MB; a large matrix goes into a file of its own.',
      )
    // A pipe tells no size: read no more than is allowed.
    const chunks: Uint8Array[] = []
    let total = 0
    for await (const chunk of handle.createReadStream({ autoClose: false }) as AsyncIterable<Uint8Array>) {
      total += chunk.length
      if (total > largestFile)
        throw unusable('too-large', file, 'The file has more than 16 MB.', 'A scenario has at most 16 MB.')
      chunks.push(chunk)
    }
    return Buffer.concat(chunks)
  } catch (error) {
    if (error instanceof StillmarkError) throw error
    throw unusable(
      'not-readable',
      file,
      `The file can't be read (${(error as NodeJS.ErrnoException).code}).`,
      'Check its permissions.',
    )
  } finally {
    await handle.close()
  }
}

function besides(file: string, name: string): string {
  const bytes = readFileSync(resolve(dirname(file), name))
  if (bytes.length > largestMatrix)
    throw unusable('too-large', name, 'The matrix file has more than 512 MB.', 'Give a smaller matrix.')
  return bytes.toString('utf8')
}

const unusable = (code: string, file: string, what: string, next: string): StillmarkError =>
  new StillmarkError({ code, where: { file }, what, next })
