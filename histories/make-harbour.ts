/**
 * Writes histories/harbour.ndjson: a made-up morning at a ferry harbour, one key for each thing that can go wrong
 * and some on which nothing does.   npx tsx histories/make-harbour.ts > histories/harbour.ndjson
 *
 * A story is a list of moments, a moment what several clients do at once; one moment is 10 ms, a request 3 ms.
 */
const BASE = 1719830000000000000n
const MS = 1_000_000n

type Step = readonly [client: string, op: string, value?: unknown, more?: Record<string, unknown>]
const records: string[] = []
/** Where each client's clock stands, so that nobody sends two requests at once. */
const free = new Map<string, bigint>()

function at(key: string, startMs: number, ...moments: (readonly Step[])[]): void {
  moments.forEach((steps, i) => {
    for (const [client, op, value, more = {}] of steps) {
      const { lasts = 3, ...rest } = more as { lasts?: number | null }
      // A little unevenness, the same every time.
      const start = BASE + BigInt(startMs + 10 * i) * MS + BigInt((records.length * 7919) % 900) * 1000n
      if ((free.get(client) ?? 0n) > start)
        throw new Error(`${client} is busy at ${startMs + 10 * i} ms (${key})`)
      const end =
        lasts === null
          ? undefined
          : start + BigInt(lasts) * MS + BigInt((records.length * 104729) % 700) * 1000n
      free.set(client, end ?? start + 10_000n * MS)
      const fields: [string, string][] = [
        ['client', JSON.stringify(client)],
        ['op', JSON.stringify(op)],
        ['key', JSON.stringify(key)],
        ...(value === undefined
          ? []
          : [[op === 'increment' ? 'by' : 'value', JSON.stringify(value)] as [string, string]]),
        ...Object.entries(rest).map(([name, each]) => [name, JSON.stringify(each)] as [string, string]),
        ['start', String(start)],
        ...(end === undefined ? [] : [['end', String(end)] as [string, string]]),
      ]
      records.push(`{${fields.map(([name, text]) => `"${name}":${text}`).join(',')}}`)
    }
  })
}

// Nothing wrong: a berth that is assigned and read, a board, a counter, a lease handed on.
at(
  'berth/1',
  0,
  [['gate-1', 'write', 'MV Alma 0611']],
  [
    ['kiosk-1', 'read', 'MV Alma 0611'],
    ['kiosk-2', 'read', 'MV Alma 0611'],
  ],
  [['gate-1', 'write', 'MV Brisa 0640']],
  [['kiosk-1', 'read', 'MV Brisa 0640']],
)
at(
  'sailing/11/boarded',
  50,
  [
    ['gate-1', 'increment', 2],
    ['gate-2', 'increment', 2],
  ],
  [['gate-1', 'increment', 2]],
  [['desk-1', 'read', 6]],
)
at(
  'lease/gangway-4',
  100,
  [['desk-1', 'cas', 'desk-1', { expect: null }]],
  [['desk-2', 'cas', 'desk-2', { expect: null, applied: false, saw: 'desk-1' }]],
  [['desk-2', 'cas', 'desk-2', { expect: 'desk-1' }]],
  [['desk-1', 'read', 'desk-2']],
)

// One key for each kind of finding.
at(
  'berth/2',
  150,
  [['gate-1', 'write', 'MV Celta 0702']],
  [['gate-2', 'write', 'MV Duna 0715']],
  [['kiosk-1', 'read', 'MV Celta 0702']],
  [['kiosk-2', 'read', 'MV Duna 0715']],
)
at(
  'berth/3',
  200,
  [['gate-2', 'write', 'MV Estela 0721']],
  [['gate-1', 'write', 'MV Faro 0730']],
  [['gate-1', 'read', 'MV Estela 0721']],
  [['kiosk-2', 'read', 'MV Faro 0730']],
)
at(
  'berth/4',
  250,
  [['gate-1', 'write', 'MV Gala 0738']],
  [['gate-2', 'write', 'MV Hero 0745', { lasts: 45 }]],
  [['kiosk-1', 'read', 'MV Hero 0745']],
  [['kiosk-1', 'read', 'MV Gala 0738']],
  [['kiosk-2', 'read', 'MV Hero 0745']],
)
at(
  'berth/5',
  310,
  [['gate-1', 'write', 'MV Isla 0752']],
  [['gate-2', 'write', 'MV Jara 0800', { lasts: 45 }]],
  [['kiosk-1', 'read', 'MV Jara 0800']],
  [['kiosk-2', 'read', 'MV Isla 0752']],
  [['desk-1', 'read', 'MV Jara 0800']],
)
at(
  'berth/6',
  370,
  [['gate-1', 'write', 'MV Kora 0810']],
  [['gate-2', 'write', 'MV Luna 0822']],
  [['kiosk-1', 'read', 'MV Kora 0810']],
  [['kiosk-2', 'read', 'MV Kora 0810']],
)
at(
  'berth/7',
  420,
  [['gate-1', 'write', 'MV Mar 0830']],
  [['kiosk-1', 'read', 'MV Mar 0830']],
  [['gate-2', 'write', 'MV Nube 0841']],
  [['kiosk-1', 'read', 'MV Nube 0841']],
  [['kiosk-2', 'read', 'MV Mar 0830']],
  [['gate-1', 'write', 'MV Ola 0850']],
  [['desk-1', 'read', 'MV Ola 0850']],
)
at(
  'berth/8',
  500,
  [
    ['gate-1', 'write', 'MV Perla 0902'],
    ['gate-2', 'write', 'MV Quilla 0902'],
  ],
  [
    ['kiosk-1', 'read', 'MV Perla 0902'],
    ['kiosk-2', 'read', 'MV Quilla 0902'],
  ],
)
at(
  'lease/gangway-7',
  530,
  [['gate-1', 'write', 'free']],
  [
    ['desk-1', 'cas', 'desk-1 0910', { expect: 'free' }],
    ['desk-2', 'cas', 'desk-2 0910', { expect: 'free' }],
  ],
)
at(
  'board/12',
  560,
  [['desk-1', 'write', { berth: 2, state: 'boarding' }]],
  [['desk-2', 'write', { berth: 5, state: 'closed' }]],
  [['kiosk-1', 'read', { berth: 2, state: 'closed' }]],
)
at('board/13', 600, [['desk-1', 'write', 'on time']], [['kiosk-1', 'read', 'departed yesterday']])
at(
  'board/14',
  630,
  [['desk-1', 'write', 'on time, berth 1']],
  [['desk-2', 'write', 'cancelled', { outcome: 'refused' }]],
  [['kiosk-2', 'read', 'cancelled']],
)
at('board/15', 670, [['kiosk-1', 'read', 'delayed 10 min']], [['desk-1', 'write', 'delayed 10 min']])
at(
  'sailing/17/boarded',
  700,
  [['gate-1', 'increment', 1]],
  [['kiosk-1', 'read', 1]],
  [['gate-2', 'increment', 1]],
  [['kiosk-2', 'read', 1]],
)
at(
  'sailing/18/boarded',
  750,
  [['kiosk-1', 'read', 0]],
  [['gate-2', 'increment', 1]],
  [['kiosk-2', 'read', 2]],
)
at(
  'sailing/19/boarded',
  790,
  [['gate-3', 'increment', 1, { lasts: null }]],
  [['kiosk-1', 'read', 1]],
  [['kiosk-2', 'read', 0]],
)
at(
  'berth/9',
  830,
  [['gate-1', 'write', 'MV Rada 0930']],
  [['gate-2', 'write', 'MV Sal 0945', { outcome: 'unsure' }]],
  [['kiosk-1', 'read', 'MV Rada 0930']],
)

const marks = [
  `{"mark":"replica 2 stopped","start":${BASE + 150n * MS},"end":${BASE + 330n * MS}}`,
  `{"mark":"failover to replica 2","start":${BASE + 365n * MS}}`,
]
const header = { history: 1, title: 'harbour morning, gate drill' }
process.stdout.write(`${[JSON.stringify(header), ...records, ...marks].join('\n')}\n`)
