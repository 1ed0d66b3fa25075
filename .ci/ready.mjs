// Installs the packages and builds the program where that has not been done for the files as they are now.
// Runs before anything is installed, so it uses Node alone.
import { spawnSync } from 'node:child_process'
import { createHash } from 'node:crypto'
import { existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'

const top = dirname(dirname(fileURLToPath(import.meta.url)))

/** One line on what is being done; what a step prints is shown only where it fails. */
function step(what, command, args) {
  process.stderr.write(`${what} …\n`)
  const done = spawnSync(command, args, { cwd: top, encoding: 'utf8', shell: process.platform === 'win32' })
  if (done.status === 0) return
  process.stderr.write(`${done.stdout ?? ''}${done.stderr ?? ''}\n`)
  process.stderr.write(
    `${what}: \`${[command, ...args].join(' ')}\` failed${done.error ? ` (${done.error.message})` : ''}.\n`,
  )
  process.exit(70)
}

const fingerprint = (files) => {
  const hash = createHash('sha256')
  for (const file of files)
    hash
      .update(file)
      .update('\0')
      .update(readFileSync(join(top, file)))
      .update('\0')
  return hash.digest('hex')
}
const sources = (folder) =>
  readdirSync(join(top, folder), { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile())
    .map((entry) => join(entry.parentPath, entry.name).slice(top.length + 1))
    .sort()

/** Does the step unless the stamp says that it was done for just these files. */
function once(stamp, files, doIt) {
  const now = fingerprint(files)
  const path = join(top, stamp)
  if (existsSync(path) && readFileSync(path, 'utf8') === now) return
  doIt()
  mkdirSync(dirname(path), { recursive: true })
  writeFileSync(path, now)
}

export function ready() {
  const [major, minor] = process.versions.node.split('.').map(Number)
  if (major < 20 || (major === 20 && minor < 16)) {
    process.stderr.write(`Node ${process.versions.node} is too old: Stillmark needs Node 20.16 or newer.\n`)
    process.exit(70)
  }
  once('node_modules/.stillmark-installed', ['package.json', 'package-lock.json'], () =>
    step('Installing packages', 'npm', ['ci', '--no-audit', '--no-fund']),
  )
  once('dist/.stillmark-built', ['package.json', 'tsconfig.json', ...sources('src')], () =>
    step('Building', 'npm', ['run', '--silent', 'build']),
  )
}

if (process.argv[1] === fileURLToPath(import.meta.url)) ready()
