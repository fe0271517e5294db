/** What the documentation shows is what the program does. */
import { existsSync, readdirSync, readFileSync } from 'node:fs'
import { join } from 'node:path'
import { describe, expect, it } from 'vitest'
import { VERSION } from '../src/version.js'
import { misread } from './cli/in-process.js'

const pages = [
  'README.md',
  'DEVELOPERS.md',
  'histories/README.md',
  ...readdirSync('docs')
    .filter((name) => name.endsWith('.md'))
    .map((name) => join('docs', name)),
]
const texts = new Map(pages.map((page) => [page, readFileSync(page, 'utf8')]))

describe('the documentation', () => {
  it('shows the output of the command before it', async () => {
    const [, command, output] = /npx misread (check [^\n]*"berth\/2")\n```\n\n```text\n([\s\S]*?)\n```/.exec(
      texts.get('README.md')!,
    )!
    const { out } = await misread(command.replaceAll('"', '').split(' '))
    expect(out.trimEnd()).toBe(output)
  })

  it.each(pages)('%s links to files that exist', (page) => {
    const links = [...texts.get(page)!.matchAll(/\]\((?!https?:)([^)#]+)\)/g)].map(([, link]) =>
      join(page, '..', link),
    )
    expect(links.filter((link) => !existsSync(link))).toEqual([])
  })

  it('names only commands, options and scripts that exist', async () => {
    const { scripts } = JSON.parse(readFileSync('package.json', 'utf8'))
    let help = ''
    const commands = [...(await misread(['--help'])).out.matchAll(/^ {2}([a-z]+) /gm)].map(([, name]) => name)
    for (const command of commands) help += (await misread([command, '--help'])).out
    for (const [page, text] of texts) {
      for (const [, script] of text.matchAll(/npm run ([a-z]+)/g))
        expect(Object.keys(scripts), page).toContain(script)
      for (const [, command] of text.matchAll(/misread ([a-z]+) [A-Zh-]/g))
        expect(commands, page).toContain(command)
      for (const [option] of text.matchAll(/(?<=`)--[a-z-]+/g))
        expect(help, `${page} names ${option}`).toContain(option)
    }
  })

  it('has the records of the format page read without an error', async () => {
    const blocks = [...texts.get('docs/format.md')!.matchAll(/```json\n([\s\S]*?)```/g)].map(
      ([, block]) => block,
    )
    expect(blocks.length).toBeGreaterThan(3)
    const { status, err } = await misread(['check', '-'], { input: blocks.join('') })
    expect(err).toBe('')
    expect([0, 1, 3]).toContain(status)
  })

  it('agrees with package.json on the version', () => {
    expect(JSON.parse(readFileSync('package.json', 'utf8')).version).toBe(VERSION)
  })

  it('names no machine, registry or path of anybody', () => {
    for (const [page, text] of texts)
      expect(text, page).not.toMatch(/registry\.|(^|[^A-Za-z0-9_./-])\/(home|root|tmp)\//m)
  })
})
