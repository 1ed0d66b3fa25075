import { mkdir, rename, rm, writeFile } from 'node:fs/promises'
import { basename, join } from 'node:path'
import { StillmarkError } from '../errors/stillmark-error.js'
import type { JobResult } from '../jobs/job-result.js'
import { toJson } from '../report/json.js'
import { toMarkdown, type Versions } from '../report/markdown.js'

/** Writes NAME.md and NAME.json into a folder, each whole or not at all. @returns their paths */
export async function writeReport(folder: string, result: JobResult, versions: Versions): Promise<readonly string[]> {
  const name = basename(result.document.scenario.file).replace(/\.(ya?ml|json)$/i, '')
  const contents = [
    [join(folder, `${name}.md`), toMarkdown(result, versions)],
    [join(folder, `${name}.json`), `${toJson(result.document, true)}\n`],
  ] as const
  try {
    await mkdir(folder, { recursive: true })
    for (const [path, content] of contents) await writeWhole(path, content)
  } catch (error) {
    throw new StillmarkError({
      code: 'report-not-written',
      where: { file: folder },
      what: `The report can't be written (${(error as NodeJS.ErrnoException).code ?? 'unknown reason'}).`,
      next: 'Check that the folder can be written to and that the disk has room.',
    })
  }
  return contents.map(([path]) => path)
}

/** Under another name first: a reader never meets half a file. */
async function writeWhole(path: string, content: string): Promise<void> {
  const part = `${path}.${process.pid}.tmp`
  try {
    await writeFile(part, content, { flush: true })
    await rename(part, path)
  } catch (error) {
    await rm(part, { force: true })
    throw error
  }
}
