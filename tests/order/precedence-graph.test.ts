import { describe, expect, it } from 'vitest'
import { readHistory } from '../../src/history/read.js'
import { textSource } from '../../src/history/source.js'
import { countPairs } from '../../src/order/counting.js'
import { gatherKey, indexByKey } from '../../src/order/key-history.js'
import { cycleEdges, generations, precedenceGraph, shortestCycle } from '../../src/order/precedence-graph.js'
import { findVersions } from '../../src/order/versions.js'
import { linearizable } from '../../src/promises/linearizable.js'
import { storyText } from '../findings/story.js'

async function graphOf(story: string) {
  const history = await readHistory([textSource('story', storyText(story))])
  const key = gatherKey(history, indexByKey(history), 0, 0n)
  const counting = countPairs(key, linearizable)
  const versions = findVersions(key)
  return precedenceGraph(
    counting,
    versions,
    Array.from({ length: versions.count }, (_, v) => v),
  )
}

describe('the precedence graph of a key', () => {
  it('has no cycle where the key holds, and gives the versions in generations', async () => {
    const graph = await graphOf('A w1 | A w2 & B w3 | C r2')
    expect(shortestCycle(graph)).toBeUndefined()
    // Version 0 is the initial value; 2 and 3 were written at once, and the read of 2 makes it the later one.
    expect(generations(graph)).toEqual([[0], [1], [3], [2]])
  })

  it('finds the shortest cycle and the operations that witness it', async () => {
    const graph = await graphOf('A w1 | A w2 | A w3 | C r1')
    const cycle = shortestCycle(graph)!
    expect([...cycle].sort()).toEqual(expect.arrayContaining([1]))
    expect(cycle).toHaveLength(2)
    for (const { type, before, after } of cycleEdges(graph, cycle)) {
      expect(type).toBe('pair')
      expect(before).not.toBe(after)
    }
  })
})
