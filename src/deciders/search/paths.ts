/**
 * How configurations came about: each placement that shows is a node that knows the one before it.
 */
import { grown } from './configurations.js'

export const NO_NODE = -1

export class Paths {
  #parent = new Int32Array(1024)
  #operation = new Int32Array(1024)
  #count = 0
  #tidyAt = 1 << 20

  /** The node after `parent` at which local operation `p` was placed. */
  add(parent: number, p: number): number {
    if (this.#count === this.#parent.length) {
      this.#parent = grown(this.#parent, 2 * this.#count)
      this.#operation = grown(this.#operation, 2 * this.#count)
    }
    this.#parent[this.#count] = parent
    this.#operation[this.#count] = p
    return this.#count++
  }

  /** The operations placed on the way to a node, first to last. */
  sequence(node: number): number[] {
    const sequence: number[] = []
    for (let at = node; at >= 0; at = this.#parent[at]) sequence.push(this.#operation[at])
    return sequence.reverse()
  }

  get isFull(): boolean {
    return this.#count >= this.#tidyAt
  }

  /** Drops every node that leads to none of these, and returns where these are now. */
  tidy(nodes: readonly number[]): number[] {
    const place = new Int32Array(this.#count).fill(-1)
    for (let at of nodes) for (; at >= 0 && place[at] < 0; at = this.#parent[at]) place[at] = 0
    let kept = 0
    // A node stands behind its parent, so the parent has moved before it.
    for (let at = 0; at < this.#count; at++) {
      if (place[at] < 0) continue
      place[at] = kept
      const parent = this.#parent[at]
      this.#parent[kept] = parent < 0 ? parent : place[parent]
      this.#operation[kept++] = this.#operation[at]
    }
    this.#count = kept
    this.#tidyAt = Math.max(1 << 20, 2 * kept)
    return nodes.map((at) => (at < 0 ? at : place[at]))
  }
}
