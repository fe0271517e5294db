/**
 * The harbour: what keys, clients, hosts and vessels are called.
 */
const VESSELS = [
  ...['Alma', 'Brisa', 'Celta', 'Duna', 'Estela', 'Faro', 'Gala', 'Hero', 'Isla', 'Jara', 'Kora', 'Luna'],
  ...['Mar', 'Nube', 'Ola', 'Perla', 'Quilla', 'Rada', 'Sal', 'Tala', 'Urca', 'Vela', 'Yola', 'Zarpa'],
]

export type KeyKind = 'berth' | 'sailing' | 'lease'

/** How many keys of each kind there are. */
export interface KeyCounts {
  readonly berths: number
  readonly sailings: number
  readonly leases: number
}

/** All keys in order: berths, then sailings, then leases. */
export function keyNames({ berths, sailings, leases }: KeyCounts): string[] {
  const names = (count: number, name: (n: number) => string): string[] =>
    Array.from({ length: count }, (_, i) => name(i + 1))
  return [
    ...names(berths, (n) => `berth/${n}`),
    ...names(sailings, (n) => `sailing/${n + 10}/boarded`),
    ...names(leases, (n) => `lease/gangway-${n}`),
  ]
}

/** Every client both reads and changes; the names only make them easier to tell apart. */
export function clientName(i: number): string {
  return `${['gate', 'kiosk', 'desk'][i % 3]}-${Math.floor(i / 3) + 1}`
}

export function hostName(i: number): string {
  return `terminal-${i + 1}`
}

export function nodeName(i: number): string {
  return `node-${i + 1}`
}

/** The n-th vessel to call, from 0: no two are called the same. */
export function vesselName(n: number): string {
  return `MV ${VESSELS[n % VESSELS.length]} ${n + 1}`
}
