import { describe, expect, it } from 'vitest'
import { InputError } from '../../src/history/problems.js'
import { parsePromisesFile } from '../../src/promises/promises-file.js'

function problemOf(text: string): string {
  try {
    parsePromisesFile(text, 'p.yaml')
  } catch (error) {
    if (error instanceof InputError) return error.message
    throw error
  }
  return ''
}

describe('a promises file', () => {
  it('names promises with keys and parameters, in YAML or JSON', () => {
    const yaml = parsePromisesFile(
      'promises:\n  - name: board\n    keys: "board/**"\n    promise: bounded-staleness\n    within: 2s\n    versions: 3\n  - promise: durable\n    settle: 500ms\n',
      'p.yaml',
    )
    expect(
      yaml.map(({ name, keys, parameters, place }) => ({ name, keys, parameters, line: place?.line })),
    ).toEqual([
      { name: 'board', keys: 'board/**', parameters: { within: '2s', versions: '3' }, line: 2 },
      { name: 'durable', keys: '**', parameters: { settle: '500ms' }, line: 7 },
    ])
    expect(yaml[0].rule).toMatchObject({ withinNs: 2_000_000_000n, versions: 3 })
    expect(
      parsePromisesFile('{"promises":[{"promise":"regular","keys":"a/*"}]}', 'p.json')[0].rule?.name,
    ).toBe('regular')
  })

  it.each([
    [
      'promises:\n  - promise: linearisable\n',
      'p.yaml:2:14: found there is no promise "linearisable"; did you mean linearizable?',
    ],
    [
      'promises:\n  - promise: regular\n    key: "a"\n',
      'p.yaml:3:5: found the member "key", expected name, keys, promise, within, versions, settle; did you mean keys?',
    ],
    ['promises:\n  - keys: "a"\n', 'p.yaml:2:5: found an entry without promise'],
    ['promises:\n  - promise: regular\n    within: 2s\n', 'has no parameter "within"'],
    ['promises:\n  - promise: bounded-staleness\n', 'needs within or versions'],
    ['promises:\n  - promise: bounded-staleness\n    within: soon\n', 'expected a duration'],
    [
      'promises:\n  - promise: regular\n  - promise: regular\n',
      'p.yaml:3:5: found a second promise named "regular"',
    ],
    ['promise:\n  - promise: regular\n', 'found no list of promises'],
    ['promises: []\n', 'found no list of promises'],
    ['', 'found no list of promises'],
    ['promises:\n  - promise: "regular\n', 'p.yaml:'],
    ['a: &a [x,x]\nb: &b [*a,*a]\npromises: *b\n', 'found no list of promises'],
  ])('%j is refused with its line', (text, message) => {
    expect(problemOf(text)).toContain(message)
  })
})
