import { describe, expect, it } from 'vitest'
import { parseMapping } from '../../src/adapters/mapping-file.js'
import { makePlan } from '../../src/adapters/plan.js'
import { formatProblem } from '../../src/history/problems.js'
import { problemsOf } from './converting.js'

const SOUND = `mapping: 1
format: csv
unit: ms
client: terminal
op: verb
key: berth/{berth}
start: sent
end: done
outcome: acked
`

/** Problems of SOUND with something more, or replaced. */
async function problems(more: string): Promise<string[]> {
  const names = [...more.matchAll(/^([a-z]+):/gm)].map(([, name]) => name)
  const kept = SOUND.split('\n').filter((line) => !names.includes(line.split(':')[0]))
  const text = [...kept.filter((line) => line !== ''), more].join('\n')
  const found = await problemsOf(() => makePlan(parseMapping(text, 'map.yaml')))
  return found.map(formatProblem)
}

describe('a mapping file', () => {
  it('may be YAML or JSON', () => {
    const yaml = parseMapping(SOUND, 'map.yaml').spec
    expect(parseMapping(JSON.stringify(yaml), 'map.json').spec).toEqual(yaml)
    expect(() => makePlan(parseMapping(SOUND, 'map.yaml'))).not.toThrow()
  })

  // What stands there, and the place and the start of the message.
  it.each([
    ['clint: x', 'map.yaml:10:1: found "clint", expected mapping, format', 'did you mean client?'],
    ['value: {filed: a}', 'map.yaml:10:9: found "filed", expected field, template', 'did you mean field?'],
    ['value: {read: a, wrte: b}', 'map.yaml:10:18: found "wrte", expected field', 'did you mean write?'],
    ['value: {read: {as: strng}}', 'map.yaml:10:20: found "strng", expected unchanged, string', ''],
    ['client: {field: c, lane: true}', 'map.yaml:9:20: found "lane", expected field', 'did you mean lanes?'],
    ['format: cvs', 'map.yaml:9:9: found "cvs", expected csv, ndjson, otlp', ''],
    ['outcome: ok', 'map.yaml:9:10: found "ok", expected acked, refused, unsure or a list', ''],
    ['outcome: [{field: s, equal: 1, outcome: acked}]', 'map.yaml:9:22: found "equal"', 'mean equals?'],
    [
      'outcome: [{field: s, matches: "(", outcome: acked}]',
      'map.yaml:9:31: found "\\"(\\"", expected a reg',
      '',
    ],
    ['outcome: [{field: s, outcome: acked}]', 'map.yaml:9:11: found no test, expected one of equals', ''],
    ['outcome: [{equals: 1, outcome: acked}]', 'map.yaml:9:11: found no field', ''],
    ['value: {read: a, field: b}', 'map.yaml:10:25: found field beside read, expected one source', ''],
    ['key: 3', 'map.yaml:9:6: found "3", expected text or members of its own', ''],
    ['key: berth/{b', 'map.yaml:9:6: found "berth/{b", expected each field in a pair of braces', ''],
    ['key: {field: a, constant: b}', 'map.yaml:9:6: found field and constant, expected one of', ''],
    ['key: {as: string}', 'map.yaml:9:6: found no field, expected one of', ''],
    ['by: {constant: 0x1F}', 'map.yaml:10:16: found "0x1F", expected a number as JSON writes it', ''],
    ['start: {field: a, unit: h}', 'map.yaml:9:25: found "h", expected ns, us, ms, s, iso', ''],
    ['duration: {field: a}', 'map.yaml:10:11: found start, end and duration, expected two of them', ''],
    ['end: {field: a, unit: iso}\nend: a', 'map.yaml:10:1: found Map keys must be unique', ''],
    ['header: {clockError: 2}', 'map.yaml:10:22: found "2", expected text', ''],
    ['header: {clockError: soon}', 'map.yaml:10:22: found "soon", expected a duration', ''],
    ['keep: {value: a}', 'map.yaml:10:15: found "value", expected a name that has no meaning', ''],
    ['otlp: {kinds: [client]}', 'map.yaml:10:7: found otlp: in a mapping of csv, expected no otlp:', ''],
    ['keep: {from: a}\nplace: from', 'map.yaml:11:8: found "from", expected a name that nothing else', ''],
    ['by: *unknown', 'map.yaml:10:5: found "*unknown", expected the name of an anchor before it', ''],
    ['by: &a [*a]', 'map.yaml:10:9: found "*a", expected a mapping of sane size and depth', ''],
    ['mapping: 2', 'map.yaml:9:10: found "2", expected 1', ''],
    ['skip: []', 'map.yaml:10:7: found "[]", expected something, not nothing', ''],
  ])('says where %s goes wrong and what was expected', async (more, start, end) => {
    const [first] = await problems(more)
    expect(first.slice(0, start.length)).toBe(start)
    expect(first).toContain(end)
  })

  it.each([
    ['client', 'no client, expected client: and the field'],
    ['op', 'no op, expected op: and the field'],
    ['key', 'no key, expected text'],
    ['end', 'only one time, expected two of start, end and duration'],
    ['outcome', 'no outcome, expected outcome: and rules'],
    ['unit', 'a time without unit, expected unit: ns, us, ms, s or iso'],
    ['mapping', 'no mapping, expected 1'],
  ])('has to have %s', async (name, expected) => {
    const text = SOUND.split('\n')
      .filter((line) => !line.startsWith(`${name}:`))
      .join('\n')
    const found = await problemsOf(() => makePlan(parseMapping(text, 'map.yaml')))
    expect(formatProblem(found[0])).toContain(`found ${expected}`)
  })

  it('may say the same thing twice by an anchor', () => {
    const text = SOUND.replace('sent', '&stamp {field: at, unit: us}').replace('done', '*stamp')
    expect(parseMapping(text, 'map.yaml').spec.end).toEqual({ field: 'at', unit: 'us' })
  })

  it('tells at most twenty problems', async () => {
    const many = Array.from({ length: 30 }, (_, i) => `wrong${i}: 1`).join('\n')
    expect(await problems(many)).toHaveLength(20)
  })

  it('that is empty or no YAML is refused', async () => {
    for (const text of ['', '[1, 2', 'key: "a', '- 1'])
      expect((await problemsOf(() => parseMapping(text, 'map.yaml')))[0].file).toBe('map.yaml')
  })
})
