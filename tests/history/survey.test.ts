import { describe, expect, it } from 'vitest'
import { readTolerantly } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { surveyHistory } from '../../src/history/survey.js'

describe('a survey', () => {
  it('counts clients, hosts and keys of the records that can be used, and of no others', async () => {
    const { history, problemCount } = await readTolerantly([
      textSource(
        'f',
        [
          '{"client":"a","host":"h","op":"delete","key":"k","start":1,"end":2}',
          '{"client":"ghost","host":"nowhere","op":"write","key":"none","start":1,"end":2}',
          '',
        ].join('\n'),
      ),
    ])
    expect(problemCount).toBe(1)
    const { clients, hosts, keys } = surveyHistory(history)
    expect({ clients, hosts, keys }).toEqual({
      clients: 1,
      hosts: 1,
      keys: { register: 1, counter: 0, mixed: 0 },
    })
  })
})
