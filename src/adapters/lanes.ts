/**
 * Splits a client of the source whose requests overlap into lanes, in each of which one request follows another.
 *
 * A lane keeps only the time from its first request to its last one, so that what it needs does not grow with the
 * log: a request goes into a lane that it wholly follows or precedes. Logs in the order of starts or of ends,
 * forward or backward, get no more lanes than they had requests in flight at once; shuffled ones get more.
 */
interface Lane {
  readonly name: string
  /** start of the earliest request, ns */
  first: bigint
  /** end of the latest one, ns; undefined: it never came back */
  last: bigint | undefined
}

export class Lanes {
  readonly #clients = new Map<string, { count: number; readonly hosts: Map<string, HostLanes> }>()

  /**
   * The lane of a request, `CLIENT#1`, `CLIENT#2`, …. Times in ns, `end` undefined where the request never came
   * back: nothing follows it in its lane. Requests that only touch are put apart: which was first is not known. A
   * lane stays on one host, since only one clock tells what was after what.
   */
  assign(client: string, host: string, start: bigint, end: bigint | undefined): string {
    let own = this.#clients.get(client)
    if (!own) {
      own = { count: 0, hosts: new Map() }
      this.#clients.set(client, own)
    }
    let lanes = own.hosts.get(host)
    if (!lanes) {
      lanes = new HostLanes()
      own.hosts.set(host, lanes)
    }
    const lane = lanes.find(start, end)
    if (lane) return lane.name
    own.count++
    return lanes.add(`${client}#${own.count}`, start, end).name
  }

  /** How many lanes the client with the most of them has. */
  get most(): number {
    let most = 0
    for (const { count } of this.#clients.values()) most = Math.max(most, count)
    return most
  }
}

/** The lanes of one client on one host. */
class HostLanes {
  /** lanes whose last request came back, by `last` */
  readonly #byLast: Lane[] = []
  /** all lanes, by `first` */
  readonly #byFirst: Lane[] = []

  /** A lane that the request follows or precedes, which it then belongs to. */
  find(start: bigint, end: bigint | undefined): Lane | undefined {
    // The lane that ended latest before this request.
    const after = lowerBound(this.#byLast, (lane) => lane.last! < start) - 1
    if (after >= 0) {
      const [lane] = this.#byLast.splice(after, 1)
      lane.last = end
      this.#addByLast(lane)
      return lane
    }
    // The lane that began soonest after it.
    const before = lowerBound(this.#byFirst, (lane) => end === undefined || lane.first <= end)
    if (before === this.#byFirst.length) return undefined
    const [lane] = this.#byFirst.splice(before, 1)
    lane.first = start
    this.#addByFirst(lane)
    return lane
  }

  add(name: string, start: bigint, end: bigint | undefined): Lane {
    const lane = { name, first: start, last: end }
    this.#addByLast(lane)
    this.#addByFirst(lane)
    return lane
  }

  #addByLast(lane: Lane): void {
    const { last } = lane
    if (last === undefined) return
    this.#byLast.splice(
      lowerBound(this.#byLast, (other) => other.last! < last),
      0,
      lane,
    )
  }

  #addByFirst(lane: Lane): void {
    this.#byFirst.splice(
      lowerBound(this.#byFirst, (other) => other.first < lane.first),
      0,
      lane,
    )
  }
}

/** How many lanes from the front fulfil what only those at the front do. */
function lowerBound(lanes: readonly Lane[], isBefore: (lane: Lane) => boolean): number {
  let low = 0
  let high = lanes.length
  while (low < high) {
    const middle = (low + high) >>> 1
    if (isBefore(lanes[middle])) low = middle + 1
    else high = middle
  }
  return low
}
