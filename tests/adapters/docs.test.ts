/** What docs/convert.md shows is what the program does. */
import { readFileSync } from 'node:fs'
import { describe, expect, it } from 'vitest'
import { mappingSchema } from '../../src/adapters/mapping-schema.js'
import { misread } from '../cli/in-process.js'

const page = readFileSync('docs/convert.md', 'utf8')

describe('docs/convert.md', () => {
  const shown = [...page.matchAll(/`(docs\/convert\/[a-z.]+)`:\n\n```(?:csv|json|yaml)\n([\s\S]*?\n)```/g)]
  it.each(shown.map(([, file, text]) => [file, text]))('shows %s as it is', (file, text) => {
    expect(text).toBe(readFileSync(file, 'utf8'))
  })

  const runs = [
    ...page.matchAll(
      /```sh\nnpx misread (convert .*)\n```\n\n```text\n([\s\S]*?\n)```\n\nand on standard error:\n\n```text\n([\s\S]*?\n)```/g,
    ),
  ]
  it.each(runs.map(([, command, out, err]) => [command, out, err]))(
    'shows what %s does',
    async (command, out, err) => {
      expect(await misread(command.split(' '))).toEqual({ status: 0, out, err })
      // And the history is one that the reader takes.
      expect((await misread(['survey', '-'], { input: out })).status).toBe(0)
    },
  )

  it('has an example of each format', () => {
    expect(runs).toHaveLength(3)
    expect(shown).toHaveLength(5)
  })

  it('tells every member of a mapping', () => {
    for (const name of Object.keys(mappingSchema.shape)) expect(page).toMatch(new RegExp(`\`${name}[\`:]`))
  })
})
