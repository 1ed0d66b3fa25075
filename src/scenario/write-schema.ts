import { writeFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { jsonSchema } from './format-schema.js'

/** Writes scenario.schema.json beside this file: run by the build, so that what is shipped is current. */
const target = fileURLToPath(new URL('./scenario.schema.json', import.meta.url))
writeFileSync(target, `${JSON.stringify(jsonSchema(), null, 2)}\n`)
