/**
 * The findings of `causal` and `causal-convergence`: reads that are wrong by themselves keep their kinds, everything
 * else is a causal inversion, with the published bad pattern named in its sentence.
 */
import type { CausalHistory } from '../deciders/causal/causal-history.js'
import type { CausalOutcome, CausalPattern } from '../deciders/causal/decide.js'
import { type CausalStep, causalPath } from '../deciders/causal/paths.js'
import type { History } from '../history/columns.js'
import { countPairs } from '../order/counting.js'
import { gatherKey, type KeyHistory, type KeyIndex } from '../order/key-history.js'
import { findVersions, type Versions } from '../order/versions.js'
import { writtenValues } from '../promises/written-values.js'
import type { Link, RawFinding } from './raw-finding.js'
import { wrongReadFinding } from './register/wrong-reads.js'
import { quoted, Teller } from './telling.js'

/** All findings of a broken outcome; at least one. */
export function findCausal(
  history: History,
  index: KeyIndex,
  { causal, patterns }: CausalOutcome,
): RawFinding[] {
  return [
    ...causal.wrongReads.map(({ keyId, local }) => wrongRead(history, index, keyId, local)),
    ...patterns.map((pattern) => inversion(history, causal, pattern)),
  ]
}

function wrongRead(history: History, index: KeyIndex, keyId: number, local: number): RawFinding {
  const counting = countPairs(gatherKey(history, index, keyId, 0n), writtenValues)
  const operations = index.operations.subarray(index.offset[keyId], index.offset[keyId + 1])
  const versions = findVersions(counting.key)
  if (local === versions.impossibleCas)
    return { ...impossibleCasFinding(counting.key, versions), margin: 'unbounded' }
  return {
    ...wrongReadFinding(counting, history.values, versions, operations, local, []),
    margin: 'unbounded',
  }
}

/** A cas without an answer, seen to have taken effect on a value that was never there. */
function impossibleCasFinding(key: KeyHistory, versions: Versions): RawFinding {
  const tell = new Teller(key)
  const p = versions.impossibleCas
  const reader = versions.readOf.indexOf(versions.writeOf[p])
  const exhibits = [{ operation: key.operation[p], role: 'the cas that could not have taken effect' }]
  if (reader >= 0)
    exhibits.push({ operation: key.operation[reader], role: 'a read that shows that it took effect' })
  return {
    kind: 'unwritten-value',
    also: [],
    keyId: key.keyId,
    blamed: key.operation[p],
    cause: -1,
    exhibits,
    links: [],
    summary: `${tell.client(p)}'s cas on ${tell.keyName} took effect, for ${tell.value(key.value[p])} was seen, although nobody wrote the ${tell.value(key.extra[p])} that it expected.`,
  }
}

function inversion(history: History, causal: CausalHistory, pattern: CausalPattern): RawFinding {
  const story = new Story(history, causal)
  const { summary, blamed, cause } = tell(story, pattern)
  const nodes = [...story.roles.keys()]
  nodes.sort((a, b) => {
    const [s, t] = [story.startNs(a), story.startNs(b)]
    return s < t ? -1 : s > t ? 1 : causal.operation[a] - causal.operation[b]
  })
  const keys = new Set(nodes.map((node) => causal.key[node]))
  return {
    kind: 'causal-inversion',
    also: [],
    keyId: causal.key[blamed],
    keyIds: [...keys],
    blamed: causal.operation[blamed],
    cause: cause < 0 ? -1 : causal.operation[cause],
    exhibits: nodes.map((node) => ({ operation: causal.operation[node], role: story.roles.get(node)! })),
    links: story.links.map((link) => ({
      ...link,
      before: link.before < 0 ? -1 : causal.operation[link.before],
      after: causal.operation[link.after],
    })) as Link[],
    margin: 'unbounded',
    summary,
  }
}

/** Collects the operations and steps of one pattern. Nodes. */
class Story {
  readonly roles = new Map<number, string>()
  readonly links: { type: Link['type']; before: number; after: number }[] = []
  readonly #history: History
  readonly #causal: CausalHistory

  constructor(history: History, causal: CausalHistory) {
    this.#history = history
    this.#causal = causal
  }

  role(node: number, role: string): void {
    if (!this.roles.has(node)) this.roles.set(node, role)
  }

  /** Adds the path of causality from a to b. */
  path(a: number, b: number): void {
    for (const step of causalPath(this.#causal, a, b) ?? []) this.step(step)
  }

  step({ type, before, after }: CausalStep | { type: Link['type']; before: number; after: number }): void {
    if (this.links.some((l) => l.type === type && l.before === before && l.after === after)) return
    this.links.push({ type, before, after })
    for (const node of [before, after]) if (node >= 0) this.role(node, 'on the way between them')
  }

  startNs(node: number): bigint {
    return this.#history.times.startNs(this.#causal.operation[node])
  }

  client(node: number): string {
    return this.#history.clients.name(this.#causal.client[node])
  }

  key(node: number): string {
    return this.#history.keys.name(this.#causal.key[node])
  }

  value(node: number): string {
    const i = this.#causal.operation[node]
    return quoted(this.#history.values.text(this.#history.value[i]))
  }

  /** What a read returned. */
  returned(node: number): string {
    const source = this.#causal.from[node]
    return source < 0 ? 'the initial value' : this.value(source)
  }

  from(node: number): number {
    return this.#causal.from[node]
  }
}

function tell(story: Story, pattern: CausalPattern): { summary: string; blamed: number; cause: number } {
  switch (pattern.name) {
    case 'WriteCORead':
    case 'WriteCOInitRead': {
      const { read, write } = pattern
      const source = story.from(read)
      story.role(read, 'the blamed read')
      story.role(write, 'the overwriting write that it depends on')
      if (source >= 0) {
        story.role(source, 'the write of what it returned')
        story.path(source, write)
        story.step({ type: 'returned', before: source, after: read })
      } else story.step({ type: 'initial', before: -1, after: write })
      story.path(write, read)
      story.step({ type: 'overwritten', before: read, after: write })
      return {
        blamed: read,
        cause: write,
        summary: `${story.client(read)} read ${story.returned(read)} from ${story.key(read)} although it already depended on ${story.client(write)}'s later write of ${story.value(write)} to it (bad pattern ${pattern.name}).`,
      }
    }
    case 'CyclicCO': {
      const { cycle } = pattern
      cycle.forEach((node, i) => {
        story.role(node, 'part of the circle')
        const next = cycle[(i + 1) % cycle.length]
        story.step({ type: story.from(next) === node ? 'returned' : 'session', before: node, after: next })
      })
      const blamed = cycle[cycle.length - 1]
      return {
        blamed,
        cause: -1,
        summary: `Causes go round in a circle: each of ${cycle.length} operations, the first by ${story.client(cycle[0])} on ${story.key(cycle[0])}, depends on the one before it and so on itself (bad pattern CyclicCO).`,
      }
    }
    case 'CyclicCF': {
      const { cycle } = pattern
      cycle.forEach(({ node, read }, i) => {
        const next = cycle[(i + 1) % cycle.length].node
        story.role(node, 'one of the conflicting writes')
        if (read === undefined) {
          story.path(node, next)
          return
        }
        story.role(read, 'a read that takes sides')
        story.path(node, read)
        story.step({ type: 'returned', before: next, after: read })
        story.step({ type: 'conflict', before: node, after: next })
      })
      const readers = [
        ...new Set(cycle.flatMap(({ read }) => (read === undefined ? [] : [story.client(read)]))),
      ]
      const writes = cycle.map(({ node }) => `${story.client(node)}'s ${story.value(node)}`)
      const blamed = cycle.findLast(({ read }) => read !== undefined)!.read!
      return {
        blamed,
        cause: cycle[0].node,
        summary: `The writes ${writes.join(' and ')} would each have to come before the next, by what ${readers.join(' and ')} read: replicas that have seen the same writes do not agree (bad pattern CyclicCF).`,
      }
    }
  }
}
