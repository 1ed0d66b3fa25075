import { writeFileSync } from 'node:fs'
import { finiteCases, relativeError } from './finite-cases.js'

// Remakes accuracy.json: the peak relative error of each published case, as measured now. Read the difference before
// keeping it.
const finite = Object.fromEntries(
  finiteCases.map(({ id, checks }) => [id, Number(Math.max(...checks().map(relativeError)).toPrecision(2))]),
)
writeFileSync(new URL('accuracy.json', import.meta.url), `${JSON.stringify({ finite }, null, 2)}\n`)
