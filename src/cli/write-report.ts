import { randomBytes } from 'node:crypto'
import { constants } from 'node:fs'
import { access, mkdir, open, rename, rm, stat } from 'node:fs/promises'
import { basename, dirname, join, resolve } from 'node:path'
import { StillmarkError } from '../errors/stillmark-error.js'

/** What a report's files are called: the scenario's own name, with a number where several share it. */
export function reportNames(files: readonly string[]): string[] {
  const taken = new Set<string>()
  return files.map((file) => {
    const stem = basename(file).replace(/\.(ya?ml|json)$/i, '') || 'report'
    let name = stem
    for (let n = 2; taken.has(name.toLowerCase()); n++) name = `${stem}-${n}`
    taken.add(name.toLowerCase())
    return name
  })
}

/** Makes the folder before anything is run: a report that can't be written should not cost a run. */
export async function prepareFolder(folder: string): Promise<void> {
  try {
    await makeFolder(folder)
    await access(folder, constants.W_OK)
  } catch (error) {
    throw notWritten(folder, error)
  }
}

/** Step by step: `mkdir` with `recursive` never ends where the file system refuses new folders, as /proc does (Node 20). */
async function makeFolder(folder: string): Promise<void> {
  const isFolder = async (path: string): Promise<boolean> => {
    try {
      return (await stat(path)).isDirectory()
    } catch {
      return false
    }
  }
  if (await isFolder(folder)) return
  const above = dirname(resolve(folder))
  if (above !== resolve(folder)) await makeFolder(above)
  try {
    await mkdir(folder)
  } catch (error) {
    if (!(await isFolder(folder))) throw error // another program may have made it just now
  }
}

/**
 * Writes files whole or not at all: each goes to a temporary name in the same folder, and only when all of them are on
 * the disk are they given their own names.
 *
 * @throws StillmarkError report-not-written
 */
export async function writeReport(
  folder: string,
  files: readonly (readonly [name: string, text: string])[],
): Promise<void> {
  try {
    await write(folder, files)
  } catch (error) {
    throw notWritten(folder, error)
  }
}

async function write(folder: string, files: readonly (readonly [string, string])[]): Promise<void> {
  const mark = randomBytes(6).toString('hex')
  const temporary = files.map(([name]) => join(folder, `.${name}.${mark}`))
  try {
    for (const [i, [, text]] of files.entries()) {
      const handle = await open(temporary[i], 'wx')
      try {
        await handle.writeFile(text)
        await handle.sync()
      } finally {
        await handle.close()
      }
    }
    for (const [i, [name]] of files.entries()) await rename(temporary[i], join(folder, name))
  } catch (error) {
    await Promise.all(temporary.map((path) => rm(path, { force: true })))
    throw error
  }
}

const reasons: Readonly<Record<string, string>> = {
  EACCES: 'it may not be written to',
  EPERM: 'it may not be written to',
  EROFS: 'the disk is read-only',
  ENOSPC: 'the disk is full',
  EDQUOT: 'the disk quota is used up',
  EEXIST: 'there is a file of that name',
  ENOENT: 'no folder can be made there',
  ENOTDIR: 'a part of the path is a file',
  EISDIR: 'a folder stands where a file should go',
  ENAMETOOLONG: 'the name is too long',
}

function notWritten(folder: string, error: unknown): StillmarkError {
  const { code = 'unknown' } = error as NodeJS.ErrnoException
  return new StillmarkError({
    code: 'report-not-written',
    what: `The report can't be written to "${folder}": ${reasons[code] ?? code}.`,
    next: 'Name another folder with --report.',
  })
}
