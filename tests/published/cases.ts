/**
 * Published histories of one register or counter with the verdicts of their sources.
 *
 * Notation: `w1[0,10]` writes 1 from time 0 to 10, `r2[…]` reads 2, `i[…]` increments, `i=0[…]` increments and
 * returned the old value 0, `c0>1[…]` is a cas from 0 to 1 that succeeded, `c0>1!` one that failed, `∞` no response.
 * Initial value 0 where nothing else is said. `lin` is linearizable, `coh` coherent, `reg` regular.
 * `not here` marks a promise that the source does not judge; `ambiguous` a value written twice, which needs a search.
 */
export type Verdict = 'yes' | 'no' | 'not here'

export interface PublishedCase {
  readonly id: string
  readonly source: string
  /** process → operations */
  readonly processes: readonly string[]
  readonly lin: Verdict
  readonly coh?: Verdict
  readonly reg?: Verdict
  readonly ambiguous?: true
  /** why the row exists */
  readonly why: string
}

const HW = 'Herlihy and Wing 1990, Fig. 2 (from memory; recomputed)'
const PENDING = 'constructed from the sequential specification (Herlihy and Wing 1990, pending operations)'
const LAMPORT = 'Lamport 1986, regular registers (table recomputed)'
const GK97 = 'Gibbons and Korach 1997, zones (theorem from memory; examples constructed)'
const GLS = 'Golab, Li and Shah 2011, k-atomicity (constructed; recomputed)'
const SHAO = 'Shao, Welch, Pierce, Lee 2011, multi-writer regularity (constructed)'

export const TIMED: readonly PublishedCase[] = [
  {
    id: 'HW-R5',
    source: HW,
    processes: ['w0[0,10] r1[20,30]', 'w1[5,60] r0[70,80]', 'w0[40,50]'],
    lin: 'yes',
    ambiguous: true,
    why: '0 is written twice: no read mapping is given',
  },
  {
    id: 'HW-R6',
    source: HW,
    processes: ['w0[0,10] r1[20,30]', 'w1[5,60] r1[70,80]', 'w0[40,50]'],
    lin: 'no',
    ambiguous: true,
    why: 'the same, broken',
  },
  {
    id: 'STALE',
    source: 'Lamport 1979; Attiya and Welch 1994 (from memory; recomputed)',
    processes: ['w1[0,1]', 'r0[2,3]'],
    lin: 'no',
    coh: 'yes',
    why: 'sequential consistency forgives what linearizability does not',
  },
  {
    id: 'PEND-1',
    source: PENDING,
    processes: ['w1[0,1] w2[2,∞]', 'r2[4,5]'],
    lin: 'yes',
    coh: 'yes',
    why: 'a pending write may have taken effect',
  },
  {
    id: 'PEND-2',
    source: PENDING,
    processes: ['w1[0,1] w2[2,∞]', 'r1[4,5]'],
    lin: 'yes',
    coh: 'yes',
    why: 'or not',
  },
  {
    id: 'PEND-3',
    source: PENDING,
    processes: ['w1[0,1] w2[2,∞]', 'r2[4,5] r1[6,7]'],
    lin: 'no',
    coh: 'no',
    why: 'but not both in turn',
  },
  {
    id: 'INC-1',
    source: PENDING,
    processes: ['i=0[0,10]', 'i=0[0,10]'],
    lin: 'no',
    coh: 'no',
    why: 'two increments cannot both find 0',
  },
  {
    id: 'INC-2',
    source: PENDING,
    processes: ['i[0,1]', 'i[0,1]', 'r1[2,3]'],
    lin: 'no',
    coh: 'yes',
    why: 'a lost update',
  },
  {
    id: 'INC-3',
    source: PENDING,
    processes: ['i[0,1] r0[2,3]'],
    lin: 'no',
    coh: 'no',
    why: 'a client misses its own increment',
  },
  {
    id: 'INC-4',
    source: PENDING,
    processes: ['i[0,∞]', 'r1[5,6] r0[7,8]'],
    lin: 'no',
    coh: 'no',
    why: 'a pending increment does not go back',
  },
  {
    id: 'CAS-1',
    source: PENDING,
    processes: ['c0>1[0,10]', 'c0>2[0,10]'],
    lin: 'no',
    coh: 'no',
    why: 'two cas cannot both find 0',
  },
  {
    id: 'CAS-2',
    source: PENDING,
    processes: ['c0>1[0,10]', 'c0>2![0,10]'],
    lin: 'yes',
    coh: 'yes',
    ambiguous: true,
    why: 'a failed cas does not say what it saw',
  },
  {
    id: 'CAS-3',
    source: PENDING,
    processes: ['c0>1![0,1]'],
    lin: 'no',
    coh: 'no',
    ambiguous: true,
    why: 'nothing else could have changed it',
  },
  {
    id: 'CAS-4',
    source: PENDING,
    processes: ['c0>1[2,3]', 'c1>2[0,1]'],
    lin: 'no',
    coh: 'not here',
    why: 'a chain of cas against real time; sequentially consistent, but our coherent counts writes in real time, and so does not carry over',
  },
  {
    id: 'L-INV 1,1',
    source: LAMPORT,
    processes: ['w1[0,1] w2[10,20]', 'r1[11,13] r1[14,16]'],
    lin: 'yes',
    reg: 'yes',
    why: 'old, old',
  },
  {
    id: 'L-INV 1,2',
    source: LAMPORT,
    processes: ['w1[0,1] w2[10,20]', 'r1[11,13] r2[14,16]'],
    lin: 'yes',
    reg: 'yes',
    why: 'old, new',
  },
  {
    id: 'L-INV 2,2',
    source: LAMPORT,
    processes: ['w1[0,1] w2[10,20]', 'r2[11,13] r2[14,16]'],
    lin: 'yes',
    reg: 'yes',
    why: 'new, new',
  },
  {
    id: 'L-INV 2,1',
    source: LAMPORT,
    processes: ['w1[0,1] w2[10,20]', 'r2[11,13] r1[14,16]'],
    lin: 'no',
    reg: 'yes',
    coh: 'no',
    why: 'new/old inversion by one reader',
  },
  {
    id: 'L-INV two readers',
    source: LAMPORT,
    processes: ['w1[0,1] w2[10,20]', 'r2[11,13]', 'r1[14,16]'],
    lin: 'no',
    reg: 'yes',
    coh: 'yes',
    why: 'new/old inversion by two readers',
  },
  ...['1 3', '3 1', '2 3', '3 3'].map((pair): PublishedCase => {
    const [first, second] = pair.split(' ')
    return {
      id: `L-INV ${first},${second}`,
      source: LAMPORT,
      processes: ['w1[0,1] w2[10,20]', `r${first}[11,13] r${second}[14,16]`],
      lin: 'no',
      reg: 'no',
      coh: 'no',
      why: 'only a safe register may invent values',
    }
  }),
  {
    id: 'L-INV 3,2',
    source: LAMPORT,
    processes: ['w1[0,1] w2[10,20]', 'r3[11,13] r2[14,16]'],
    lin: 'no',
    reg: 'no',
    coh: 'no',
    why: 'only a safe register may invent values',
  },
  {
    id: 'Z-1',
    source: GK97,
    processes: ['w1[0,1]', 'w2[3,5]', 'r1[8,9]'],
    lin: 'no',
    why: 'a backward zone inside a forward one',
  },
  {
    id: 'Z-2',
    source: GK97,
    processes: ['w1[0,1]', 'w2[3,10]', 'r1[8,9]'],
    lin: 'yes',
    why: 'it sticks out',
  },
  {
    id: 'Z-3',
    source: GK97,
    processes: ['w1[0,1]', 'w2[0,2]', 'r1[4,5]', 'r2[6,7]'],
    lin: 'no',
    why: 'two forward zones overlap',
  },
  {
    id: 'Z-4',
    source: GK97,
    processes: ['w1[0,1]', 'w2[6,7]', 'r1[4,5]', 'r2[8,9]'],
    lin: 'yes',
    why: 'they do not',
  },
  {
    id: 'Z-5',
    source: GK97,
    processes: ['r1[0,1]', 'w1[2,3]'],
    lin: 'no',
    reg: 'no',
    why: 'a read from the future',
  },
  { id: 'K-1', source: GLS, processes: ['w1[0,1] w2[2,3]', 'r1[10,11]'], lin: 'no', why: '2-atomic only' },
  {
    id: 'K-2',
    source: GLS,
    processes: ['w1[0,1] w2[2,3] w3[4,5]', 'r1[10,11]'],
    lin: 'no',
    why: '3-atomic only',
  },
  {
    id: 'K-3',
    source: GLS,
    processes: ['w1[0,1] w2[2,9]', 'r2[3,4]', 'r1[5,6]'],
    lin: 'no',
    reg: 'yes',
    why: 'new/old inversion',
  },
  {
    id: 'K-4',
    source: GLS,
    processes: ['w1[0,1]', 'r0[2,3]'],
    lin: 'no',
    why: 'the initial value counts as a write',
  },
  {
    id: 'K-5',
    source: GLS,
    processes: ['w1[0,1]', 'w2[0,2]', 'r1[4,5]', 'r2[6,7]'],
    lin: 'no',
    reg: 'no',
    why: '2-atomic only: two forward zones that overlap (Z-3)',
  },
  {
    id: 'K-6',
    source: GLS,
    processes: ['w1[0,1]', 'w2[3,5]', 'r1[8,9]'],
    lin: 'no',
    reg: 'no',
    why: '2-atomic only: a backward zone inside a forward one (Z-1)',
  },
  {
    id: 'TS-STRICT',
    source: 'van Steen and Tanenbaum, Distributed Systems, Fig. 7.4 (from memory; recomputed)',
    processes: ['w1[0,1]', 'r0[2,3] r1[4,5]'],
    lin: 'no',
    coh: 'yes',
    why: 'sequentially consistent and not strict',
  },
  {
    id: 'HS-NEGATIVE',
    source: 'Herlihy and Shavit, The Art of Multiprocessor Programming, ch. 3 (from memory; recomputed)',
    processes: ['w7[0,10]', 'w-3[0,10]', 'r-7[20,30]'],
    lin: 'no',
    reg: 'no',
    coh: 'no',
    why: 'a value made up of two that were written together',
  },
  {
    id: 'HS-ORDER',
    source: 'Herlihy and Shavit, The Art of Multiprocessor Programming, ch. 3 (from memory; recomputed)',
    processes: ['w7[0,1] w-3[2,3] r7[4,5]'],
    lin: 'no',
    reg: 'no',
    coh: 'no',
    why: 'against the order of one program',
  },
  {
    id: 'MW-1',
    source: SHAO,
    processes: ['w1[0,10]', 'w2[0,10]', 'r1[11,12]', 'r2[11,12]'],
    lin: 'no',
    reg: 'no',
    why: 'readers disagree: weak regularity would allow it, write order does not',
  },
  {
    id: 'MW-2',
    source: SHAO,
    processes: ['w1[0,1] w2[2,20]', 'r2[3,4]', 'r1[5,6]'],
    lin: 'no',
    reg: 'yes',
    why: 'inversion is allowed by write order',
  },
  {
    id: 'MW-3',
    source: SHAO,
    processes: ['w1[0,1] w2[2,3]', 'r1[10,11]'],
    lin: 'no',
    reg: 'no',
    why: 'stale after a finished write',
  },
  {
    id: 'MW-4',
    source: SHAO,
    processes: ['w0[0,10] r1[20,30]', 'w1[5,60] r1[70,80]', 'w0[40,50]'],
    lin: 'no',
    reg: 'no',
    ambiguous: true,
    why: 'HW-R6 again: weak regularity would allow it, write order does not',
  },
]

const TERRY = 'Terry et al. 1994, session guarantees (constructed counterparts; canonical minimal violations)'

/** Histories without times, of one register: only the order in each process. The session promises that they break. */
export const SESSIONS: readonly {
  readonly id: string
  readonly source: string
  readonly processes: readonly string[]
  readonly breaks: readonly string[]
  readonly why: string
}[] = [
  {
    id: 'SG-RYW',
    source: TERRY,
    processes: ['w1 r0'],
    breaks: ['read-your-writes'],
    why: 'a read without the write before it',
  },
  {
    id: 'SG-MR',
    source: TERRY,
    processes: ['w1 w2', 'r2 r1'],
    breaks: ['monotonic-reads'],
    why: 'the writer gives the order, the reader goes against it',
  },
  {
    id: 'SG-MR0',
    source: TERRY,
    processes: ['w1', 'r1 r0'],
    breaks: ['monotonic-reads'],
    why: 'the initial value is older than any write',
  },
  {
    id: 'SG-OK on x',
    source: TERRY,
    processes: ['w1 r1', 'r1', 'r1'],
    breaks: [],
    why: 'a case that breaks nothing: all four guarantees kept',
  },
]
