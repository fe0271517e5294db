/**
 * After a change of what rehearsals or reports say: writes docs/rehearsal.md and digests.json anew.
 *   npx tsx tests/rehearsal/rewrite-page.ts
 */
import { readFileSync, writeFileSync } from 'node:fs'
import { SCENARIOS } from '../../src/rehearsal/scenarios.js'
import { rewritten } from './page.js'
import { digest } from './play.js'

const PAGE = 'docs/rehearsal.md'
rewritten(readFileSync(PAGE, 'utf8')).then((text) => writeFileSync(PAGE, text))
const digests = Object.fromEntries(SCENARIOS.map(({ name }) => [name, digest(name)]))
writeFileSync('tests/rehearsal/digests.json', `${JSON.stringify(digests, null, 2)}\n`)
