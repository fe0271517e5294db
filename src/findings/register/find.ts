/**
 * The findings of a broken register key, by the decision list of findings.md.
 */

import { initialFirst } from '../../deciders/register.js'
import { CAS, type Values } from '../../history/columns.js'
import { chainBlocks } from '../../order/blocks.js'
import type { Counting } from '../../order/counting.js'
import { cyclicCore } from '../../order/interval-orders.js'
import { precedes } from '../../order/precedence.js'
import { versionOrders } from '../../order/version-orders.js'
import { findVersions, type Versions } from '../../order/versions.js'
import { FINDING_KINDS, type FindingKind } from '../kinds.js'
import type { Link, RawFinding } from '../raw-finding.js'
import { Teller } from '../telling.js'
import { type Blame, blameRead, type Proof, sessionsOf } from './blame.js'
import { complete, readEvidence, toOperations } from './evidence.js'
import { findLostWrites } from './lost-writes.js'
import { Newer } from './newer.js'
import { orderConflict } from './order-conflict.js'
import { findReverted, type Reverted } from './reverted.js'
import {
  lostWriteSentence,
  type ReadStory,
  readSentence,
  revertedSentence,
  valueReturned,
} from './sentences.js'
import { Sift } from './sift.js'
import { findTooFarBehind } from './too-far-behind.js'
import { wrongReadFinding } from './wrong-reads.js'

/** Promises under which a loss or a reversal is told (findings.md). */
const TELLS_LOSSES = new Set(['linearizable', 'regular', 'durable', 'bounded-staleness'])

/**
 * All findings of a register key that is broken under the promise; at least one.
 * `operations` are all of the key's operation indices, refused ones too.
 */
export function findRegister(counting: Counting, values: Values, operations: Int32Array): RawFinding[] {
  const search = new Search(counting, values, operations)
  search.wrongReads()
  search.lostUpdates()
  if (TELLS_LOSSES.has(counting.rule.name)) {
    search.lostWrites()
    search.revertedValues()
  }
  search.blamedReads()
  search.tooFarBehind()
  if (search.found.length === 0)
    search.found.push(orderConflict(search.newer, suspectVersions(counting, search.versions)))
  return search.found
}

/** Versions that can take part in a cycle, in rising order. */
export function suspectVersions(counting: Counting, versions: Versions): number[] {
  const blocks = chainBlocks(versions)
  const orders = versionOrders(counting, versions, blocks.blockOf)
  orders.push(initialFirst(blocks))
  const core = new Set(cyclicCore(blocks.count, orders))
  const size = new Int32Array(blocks.count)
  for (let v = 0; v < versions.count; v++) size[blocks.blockOf[v]]++
  const suspects: number[] = []
  for (let v = 0; v < versions.count; v++) {
    if (core.has(blocks.blockOf[v]) || size[blocks.blockOf[v]] > 1) suspects.push(v)
  }
  return suspects
}

class Search {
  readonly counting: Counting
  readonly versions: Versions
  readonly newer: Newer
  readonly found: RawFinding[] = []
  readonly #values: Values
  readonly #operations: Int32Array
  readonly #tell: Teller
  /** read → what it is blamed for, reads in local order */
  readonly #blames: ReadonlyMap<number, Blame>
  /** reads that a finding already tells of */
  readonly #told = new Set<number>()

  constructor(counting: Counting, values: Values, operations: Int32Array) {
    this.counting = counting
    this.#values = values
    this.#operations = operations
    this.#tell = new Teller(counting.key)
    this.versions = findVersions(counting.key, counting.resolved)
    const suspects = suspectVersions(counting, this.versions)
    const first = new Newer(counting, this.versions)
    let blames = blameAll(first, suspects)
    this.newer = first
    if (this.versions.found.some((v) => v >= 0)) {
      // Once more, now that it is known which cas are blamed themselves.
      const blamedCas = new Uint8Array(this.versions.count)
      for (const read of blames.keys())
        if (this.versions.writeOf[read] > 0) blamedCas[this.versions.writeOf[read]] = 1
      this.newer = new Newer(counting, this.versions, blamedCas)
      blames = blameAll(this.newer, suspects)
    }
    this.#blames = blames
  }

  wrongReads(): void {
    for (const read of this.versions.wrongReads) {
      const also = this.#fitting(read)
      this.found.push(
        wrongReadFinding(this.counting, this.#values, this.versions, this.#operations, read, also),
      )
      this.#told.add(read)
    }
  }

  lostUpdates(): void {
    const { key } = this.counting
    const { found, writer } = this.versions
    const foundBy = new Map<number, number[]>()
    for (let v = 0; v < found.length; v++) {
      if (found[v] < 0) continue
      const others = foundBy.get(found[v])
      if (others) others.push(writer[v])
      else foundBy.set(found[v], [writer[v]])
    }
    for (const [version, updates] of foundBy) {
      if (updates.length < 2) continue
      updates.sort((a, b) => a - b)
      const acked = updates.filter((p) => key.acked[p] === 1)
      const blamed = acked[acked.length - 1] ?? updates[updates.length - 1]
      const other = updates.find((p) => p !== blamed)!
      const also = new Set<FindingKind>()
      for (const p of updates) {
        for (const kind of this.#fitting(p)) also.add(kind)
        this.#told.add(p)
      }
      const roles = new Map<number, string>()
      if (version > 0) roles.set(writer[version], 'the write of what both found')
      roles.set(other, 'the one update')
      roles.set(blamed, 'the other update')
      for (const p of [other, blamed]) this.#showSeen(roles, p)
      const write = version > 0 ? writer[version] : -1
      const links: Link[] = [
        { type: 'found', before: write, after: other },
        { type: 'found', before: write, after: blamed },
      ]
      this.#push({
        kind: 'lost-update',
        also: [...also],
        blamed,
        cause: other,
        roles,
        links,
        summary: this.#lostUpdateSentence(version, updates, other, blamed),
      })
    }
  }

  lostWrites(): void {
    const { versions, newer } = this
    for (const lost of findLostWrites(newer, [...this.#blames.values()])) {
      const write = versions.writer[lost.version]
      const also = new Set<FindingKind>()
      for (const read of lost.reads) {
        for (const kind of this.#fitting(read)) also.add(kind)
        this.#told.add(read)
      }
      const proof: Proof = { newer: lost.version, via: write, observedBy: undefined }
      const evidence = readEvidence(newer, versions.readOf[lost.closing], lost.closing, proof)
      for (const exhibit of evidence.exhibits) {
        if (exhibit.p === write) exhibit.role = 'the lost write'
        if (exhibit.p === lost.closing) exhibit.role = 'a closing read that returned an older value'
      }
      this.found.push({
        kind: 'lost-write',
        also: ordered(also, 'lost-write'),
        keyId: this.counting.key.keyId,
        blamed: this.counting.key.operation[lost.closing],
        cause: this.counting.key.operation[write],
        ...toOperations(newer, evidence),
        summary: lostWriteSentence(this.#tell, write, lost.reads, lost.older.length),
      })
    }
  }

  revertedValues(): void {
    const groups = new Map<string, { blame: Blame; reverted: Reverted }[]>()
    for (const blame of this.#blames.values()) {
      if (this.#told.has(blame.read)) continue
      const reverted = findReverted(this.newer, blame)
      if (!reverted) continue
      const name = `${reverted.version}/${reverted.from}`
      const group = groups.get(name)
      if (group) group.push({ blame, reverted })
      else groups.set(name, [{ blame, reverted }])
    }
    for (const group of groups.values()) {
      const { blame, reverted } = group[0]
      const also = new Set<FindingKind>()
      for (const member of group) {
        for (const kind of this.#fitting(member.blame.read)) also.add(kind)
        this.#told.add(member.blame.read)
      }
      const { versions } = this
      const write = versions.writer[reverted.from]
      const roles = new Map<number, string>()
      if (reverted.version > 0) roles.set(versions.writer[reverted.version], 'the write of the older value')
      roles.set(reverted.firstSeen, 'a read that saw the older value')
      roles.set(write, 'the write of the newer value')
      roles.set(reverted.laterSeen, 'a read that saw the newer value')
      roles.set(blame.read, 'the read that saw the older value again')
      const links: Link[] = [
        { type: 'pair', before: reverted.firstSeen, after: reverted.laterSeen },
        { type: 'returned', before: write, after: reverted.laterSeen },
        { type: 'pair', before: reverted.laterSeen, after: blame.read },
        { type: 'overwritten', before: blame.read, after: write },
      ]
      this.#push({
        kind: 'reverted-value',
        also: [...also],
        blamed: blame.read,
        cause: write,
        roles,
        links,
        summary: revertedSentence(this.#tell, versions, blame.read, reverted.from),
      })
    }
  }

  blamedReads(): void {
    for (const blame of this.#blames.values()) {
      if (this.#told.has(blame.read)) continue
      const [kind, ...also] = this.#fitting(blame.read)
      const proof = proofOf(blame, kind)
      const evidence = readEvidence(this.newer, blame.version, blame.read, proof)
      const write = this.versions.writer[proof.newer]
      const story: ReadStory = {
        read: blame.read,
        returned: valueReturned(this.versions, this.#tell, blame.read),
        write,
        via: proof.via,
        behind: this.#behind(blame),
      }
      this.found.push({
        kind,
        also,
        keyId: this.counting.key.keyId,
        blamed: this.counting.key.operation[blame.read],
        cause: this.counting.key.operation[write],
        ...toOperations(this.newer, evidence),
        summary: readSentence(kind, this.#tell, story),
      })
    }
  }

  tooFarBehind(): void {
    const bound = this.counting.rule.versions
    if (bound === undefined) return
    const { operation } = this.counting.key
    const told = new Set([...this.#told].map((p) => operation[p]))
    for (const finding of this.found) told.add(finding.blamed)
    for (const finding of findTooFarBehind(this.counting, this.versions, bound)) {
      if (!told.has(finding.blamed)) this.found.push(finding)
    }
  }

  /** The kinds of single reads that fit a read, first the one it is told as. */
  #fitting(read: number): FindingKind[] {
    const blame = this.#blames.get(read)
    if (!blame) return []
    const kinds: FindingKind[] = []
    if (blame.ownWrite) kinds.push('own-write-missed')
    if (blame.ownRead) kinds.push('backward-read')
    kinds.push(blame.finished ? 'stale-read' : 'read-inversion')
    return kinds
  }

  /** How many newer acked writes were certainly done before the read. */
  #behind({ read, version }: Blame): number {
    const { key } = this.counting
    let behind = 0
    for (const w of this.newer.reach(version).from.keys()) {
      const write = this.versions.writer[w]
      if (key.acked[write] === 1 && precedes(key, write, read)) behind++
    }
    return behind
  }

  /** An unsure cas took effect only because a read saw it: that read belongs to the evidence. */
  #showSeen(roles: Map<number, string>, update: number): void {
    const { key } = this.counting
    if (key.acked[update] === 1 || key.kind[update] !== CAS) return
    const version = this.versions.writeOf[update]
    const { offset, operations } = this.newer.members
    for (let i = offset[version]; i < offset[version + 1]; i++) {
      const p = operations[i]
      if (this.versions.readOf[p] !== version) continue
      roles.set(p, 'a read that shows that it took effect')
      return
    }
  }

  #lostUpdateSentence(version: number, updates: readonly number[], one: number, other: number): string {
    const tell = this.#tell
    const { key } = this.counting
    const value = tell.value(
      version === 0 ? this.versions.initialValue : key.value[this.versions.writer[version]],
    )
    const many = updates.length > 2 ? `, and ${updates.length - 2} more did too` : ''
    return `${tell.client(one)} and ${tell.client(other)} both replaced ${value} in ${tell.keyName}, with ${tell.value(key.value[one])} and with ${tell.value(key.value[other])}${many}: one of the updates was lost.`
  }

  #push(finding: {
    kind: FindingKind
    also: FindingKind[]
    blamed: number
    cause: number
    roles: Map<number, string>
    links: Link[]
    summary: string
  }): void {
    const { kind, also, blamed, cause, roles, links, summary } = finding
    const { keyId, operation } = this.counting.key
    const evidence = complete(this.newer, roles, links)
    this.found.push({
      kind,
      also: ordered(also, kind),
      keyId,
      blamed: operation[blamed],
      cause: operation[cause],
      ...toOperations(this.newer, evidence),
      summary,
    })
  }
}

/** Blames every read of the suspect versions, in local order. */
function blameAll(newer: Newer, suspects: readonly number[]): Map<number, Blame> {
  const { versions, members, counting } = newer
  const sessions = sessionsOf(counting.key.client)
  const reads: number[] = []
  for (const v of suspects) {
    for (let i = members.offset[v]; i < members.offset[v + 1]; i++) {
      if (versions.readOf[members.operations[i]] === v) reads.push(members.operations[i])
    }
  }
  const blames = new Map<number, Blame>()
  const sift = new Sift(newer)
  for (const read of reads.sort((a, b) => a - b)) {
    if (!sift.mayBeBlamed(read)) continue
    const blame = blameRead(newer, sessions, read)
    if (blame) blames.set(read, blame)
  }
  return blames
}

function proofOf(blame: Blame, kind: FindingKind): Proof {
  if (kind === 'own-write-missed') return blame.ownWrite!
  if (kind === 'backward-read') return blame.ownRead!
  if (kind === 'stale-read') return blame.finished!
  return blame.seen!
}

/** Kinds in the order of their list, without one of them. */
export function ordered(kinds: Iterable<FindingKind>, without: FindingKind): FindingKind[] {
  const set = new Set(kinds)
  return FINDING_KINDS.filter((kind) => kind !== without && set.has(kind))
}
