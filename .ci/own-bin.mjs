/**
 * Puts this package's own program where npx looks first, so that `npx misread` in a clone runs the clone.
 * (npm links the programs of dependencies only.)
 */
import { chmodSync, mkdirSync, rmSync, symlinkSync } from 'node:fs'

const folder = new URL('../node_modules/.bin/', import.meta.url)
const link = new URL('misread', folder)
mkdirSync(folder, { recursive: true })
rmSync(link, { force: true })
symlinkSync('../../dist/cli/bin.js', link)
chmodSync(new URL('../dist/cli/bin.js', import.meta.url), 0o755)
