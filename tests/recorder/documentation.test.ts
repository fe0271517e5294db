/** The recorder's examples in the documentation compile, run, and leave a history. */
import { spawnSync } from 'node:child_process'
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs'
import { tmpdir } from 'node:os'
import { join, resolve } from 'node:path'
import { pathToFileURL } from 'node:url'
import ts from 'typescript'
import { afterAll, describe, expect, it } from 'vitest'
import { readHistory } from '../../src/history/read.js'
import { fileSource } from '../../src/history/source.js'

const folder = mkdtempSync(join(tmpdir(), 'misread-documentation-'))
afterAll(() => rmSync(folder, { recursive: true, force: true }))
const recorder = resolve('src/recorder/index.ts')

/** A store in memory, with what the examples ask of it. Its counts are text, as in many client libraries. */
const STORE = `
const held = new Map<string, string>()
const store = {
  set: async (key: string, value: string, _options?: { ttlSeconds: number }) => void held.set(key, value),
  get: async (key: string) => held.get(key) ?? null,
  del: async (key: string) => void held.delete(key),
  incrBy: async (key: string, by: number) => {
    const count = BigInt(held.get(key) ?? '0') + BigInt(by)
    held.set(key, String(count))
    return String(count)
  },
  compareAndSet: async (key: string, expect: string | null, value: string) => {
    const applies = (held.get(key) ?? null) === expect
    if (applies) held.set(key, value)
    return applies
  },
}
`

const examples = ['README.md', 'docs/recording.md'].flatMap((page) =>
  [...readFileSync(page, 'utf8').matchAll(/```ts\n([\s\S]*?)```/g)]
    .map(([, code]) => code)
    .filter((code) => code.includes("'misread/recorder'"))
    .map((code) => [page, code]),
)

function typeErrors(file: string): string[] {
  const program = ts.createProgram([file], {
    strict: true,
    noEmit: true,
    exactOptionalPropertyTypes: true,
    skipLibCheck: true,
    target: ts.ScriptTarget.ES2022,
    module: ts.ModuleKind.NodeNext,
    moduleResolution: ts.ModuleResolutionKind.NodeNext,
    types: ['node'],
    typeRoots: [resolve('node_modules/@types')],
    paths: { 'misread/recorder': [recorder] },
  })
  return ts
    .getPreEmitDiagnostics(program)
    .map(({ messageText }) => ts.flattenDiagnosticMessageText(messageText, '\n'))
}

describe('the recorder in the documentation', () => {
  it('has an example in the README and one in its page', () => {
    expect(examples.map(([page]) => page)).toEqual(['README.md', 'docs/recording.md'])
  })

  it.each(examples)('%s: the example compiles, runs and is read', async (page, code) => {
    const name = join(folder, page.replaceAll(/\W/g, '-'))
    writeFileSync(`${name}.mts`, STORE + code)
    expect(typeErrors(`${name}.mts`)).toEqual([])
    writeFileSync(`${name}.mts`, STORE + code.replace("'misread/recorder'", `'${pathToFileURL(recorder)}'`))
    const tsx = pathToFileURL(resolve('node_modules/tsx/dist/loader.mjs')).href
    const run = spawnSync(process.execPath, ['--import', tsx, `${name}.mts`], {
      cwd: folder,
      encoding: 'utf8',
    })
    expect(run.stderr).toBe('')
    const [, path] = /path: '([^']+)'/.exec(code)!
    const history = await readHistory([await fileSource(join(folder, path))])
    const calls = code.match(/await gate\.|mayVanish/g)!
    expect(history.count).toBe(calls.length)
    rmSync(join(folder, path))
  })
})
