/**
 * The layout shows the architecture: imports go only to folders earlier in this list, so that the deciding core
 * stays free of files, clocks and terminals. `import type` is free.
 */
import { readdirSync, readFileSync } from 'node:fs'
import { fileURLToPath } from 'node:url'
import { describe, expect, it } from 'vitest'

const ORDER = [
  'history',
  'order',
  'promises',
  'deciders',
  'findings',
  'certificates',
  'freshness',
  'reports',
  'recorder',
  'adapters',
  'rehearsal',
  'workers',
  'cli',
]
const src = fileURLToPath(new URL('../src/', import.meta.url))
const files = readdirSync(src, { recursive: true, encoding: 'utf8' }).filter((name) => name.endsWith('.ts'))

/** Values imported from other files of src, as paths below it. */
function valueImports(file: string): string[] {
  const text = readFileSync(src + file, 'utf8')
  return [...text.matchAll(/^import (?!type\b)[^'"]*from '(\.[^']+)'/gm)].map(([, path]) =>
    new URL(path, `file:///${file}`).pathname.slice(1),
  )
}

describe('the arrows between folders', () => {
  it('point backward only', () => {
    const wrong = files.flatMap((file) => {
      const own = ORDER.indexOf(file.split('/')[0])
      if (own < 0) return []
      return valueImports(file)
        .filter((target) => ORDER.indexOf(target.split('/')[0]) > own)
        .map((target) => `${file} imports ${target}`)
    })
    expect(wrong).toEqual([])
  })

  it('leave the system to the edge', () => {
    // Only sources of bytes, the recorder, and the command line may touch files, processes and clocks.
    const edge = /^(cli|recorder|workers|adapters)\/|^history\/source\.ts$/
    const wrong = files.filter(
      (file) =>
        !edge.test(file) &&
        /from 'node:|process\.|Date\.now|performance\./.test(readFileSync(src + file, 'utf8')),
    )
    expect(wrong).toEqual([])
  })

  it('keep the verifier of certificates apart from all that decides', () => {
    const verifier = files.filter((name) => name.startsWith('certificates/verify/'))
    expect(verifier.length).toBeGreaterThan(5)
    const allowed = /^(history\/|certificates\/verify\/|certificates\/schema\.js$|promises\/glob\.js$)/
    const wrong = verifier.flatMap((file) =>
      valueImports(file)
        .filter((target) => !allowed.test(target))
        .map((target) => `${file} imports ${target}`),
    )
    expect(wrong).toEqual([])
  })
})
