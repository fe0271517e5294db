/**
 * Small histories as findings.md writes them: `|` one moment after the other, `&` at once, `~` still in flight for ten
 * moments, `?` unsure, `!` refused. Letters are clients; w1 writes 1, r1 reads it, i increments, i=3 returns 3,
 * c1>2 is a cas from 1 to 2.
 */
import { check } from '../../src/findings/check.js'
import type { Finding, Result } from '../../src/findings/result.js'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { parsePromise } from '../../src/promises/parse-request.js'

const MOMENT = 10

export function storyText(story: string, header: Record<string, unknown> = {}): string {
  const lines = [JSON.stringify({ history: 1, ...header })]
  story.split('|').forEach((moment, i) => {
    for (const step of moment.split('&')) {
      const [client, what] = step.trim().split(' ')
      const start = MOMENT * (i + 1)
      const end = what.includes('~') ? start + 10 * MOMENT : start + 5
      lines.push(JSON.stringify({ client, key: 'k', ...operation(what), start, end }))
    }
  })
  return `${lines.join('\n')}\n`
}

function operation(what: string): Record<string, unknown> {
  const outcome = what.includes('?')
    ? { outcome: 'unsure' }
    : what.includes('!')
      ? { outcome: 'refused' }
      : {}
  const cas = /^c(\d+|null)>(\d+)/.exec(what)
  if (cas) return { op: 'cas', expect: JSON.parse(cas[1]), value: Number(cas[2]), ...outcome }
  const [, letter, size, value] = /^([wri])([-+]\d+)?=?(\d+|null|\{.*?\}|".*?")?/.exec(what)!
  if (letter === 'i') {
    return {
      op: 'increment',
      by: Number(size ?? 1),
      ...(value === undefined ? {} : { value: Number(value) }),
      ...outcome,
    }
  }
  return { op: letter === 'w' ? 'write' : 'read', value: JSON.parse(value), ...outcome }
}

export async function checkText(
  text: string,
  promise = 'linearizable',
  counterexamples = 100,
): Promise<{ result: Result; counterexamples: readonly { path: string; text: string }[] }> {
  const source = textSource('story', text)
  return check(await readHistory([source]), [source], { promises: [parsePromise(promise)], counterexamples })
}

/** The findings of a story under a promise. */
export async function findingsOf(
  story: string,
  promise?: string,
  header?: Record<string, unknown>,
): Promise<Finding[]> {
  return [...(await checkText(storyText(story, header), promise)).result.findings]
}
