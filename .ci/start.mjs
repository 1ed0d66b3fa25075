// `npm start [-- FILE…]`: the main job, on the shipped parcel lockers where no file is named.
import { spawn } from 'node:child_process'
import { dirname, join } from 'node:path'
import { fileURLToPath } from 'node:url'
import { ready } from './ready.mjs'

ready()
const top = dirname(dirname(fileURLToPath(import.meta.url)))
const given = process.argv.slice(2)
const args = given.length > 0 ? given : [join('scenarios', 'parcel-lockers.yaml')]
// npm runs this in the package's folder; files are named from where the user stands.
const child = spawn(process.execPath, [join(top, 'dist', 'cli', 'stillmark.js'), 'check', ...args], {
  cwd: given.length > 0 ? (process.env.INIT_CWD ?? process.cwd()) : top,
  stdio: 'inherit',
})
for (const signal of ['SIGINT', 'SIGTERM']) process.on(signal, () => child.kill(signal))
child.on('exit', (status, signal) => process.exit(signal === 'SIGINT' ? 130 : (status ?? 70)))
