/**
 * The read-after-write curve as a picture of its own: share of fresh reads over the time since the newest write, with
 * its 95% band.
 */
import { scaleLinear, scaleLog } from 'd3-scale'
import { area, curveStepAfter, line } from 'd3-shape'
import { duration } from '../findings/telling.js'
import type { CurveBin, FreshnessGroup } from '../freshness/figures.js'
import { printable } from './printable.js'

const WIDTH = 720
const HEIGHT = 360
const LEFT = 64
const RIGHT = 20
const TOP = 48
const BOTTOM = 52

/** An SVG document; its colours follow the reader's light or dark scheme. */
export function freshnessSvg(group: FreshnessGroup): string {
  const { curve } = group
  const title = escaped(`How fresh reads were, by the time since the newest write: ${printable(group.name)}`)
  const first = Math.max(1_000, Number(curve[0]?.fromNs ?? 1_000))
  const last = Math.max(10 * first, ...curve.map(({ fromNs, toNs }) => Number(toNs ?? Number(fromNs) * 2)))
  const x = scaleLog([first, last], [LEFT, WIDTH - RIGHT])
  const least = Math.min(1, ...curve.map(({ low }) => low))
  const y = scaleLinear([Math.max(0, Math.floor(least * 10) / 10), 1], [HEIGHT - BOTTOM, TOP])
  const place = (ns: string | undefined): number => x(Math.max(first, Math.min(last, Number(ns ?? last))))
  // The last bin is drawn to its end.
  const steps: CurveBin[] =
    curve.length > 0 ? [...curve, { ...curve[curve.length - 1], fromNs: `${last}` }] : []
  const band = area<CurveBin>()
    .x(({ fromNs }) => place(fromNs))
    .y0(({ low }) => y(low))
    .y1(({ high }) => y(high))
    .curve(curveStepAfter)(steps)
  const share = line<CurveBin>()
    .x(({ fromNs }) => place(fromNs))
    .y((bin) => y(bin.share))
    .curve(curveStepAfter)(steps)
  const down = y
    .ticks(5)
    .map(
      (tick) =>
        `<line class="grid" x1="${LEFT}" x2="${WIDTH - RIGHT}" y1="${y(tick)}" y2="${y(tick)}"/><text x="${LEFT - 8}" y="${y(tick)}" text-anchor="end" dominant-baseline="middle">${(100 * tick).toFixed(0)}%</text>`,
    )
  const decades: number[] = []
  for (let ns = 10 ** Math.ceil(Math.log10(first) - 1e-9); ns <= last * 1.0001; ns *= 10) decades.push(ns)
  const across = decades.map(
    (ns) =>
      `<line class="grid" x1="${x(ns)}" x2="${x(ns)}" y1="${TOP}" y2="${HEIGHT - BOTTOM}"/><text x="${x(ns)}" y="${HEIGHT - BOTTOM + 18}" text-anchor="middle">${duration(BigInt(Math.round(ns)))}</text>`,
  )
  return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ${WIDTH} ${HEIGHT}" width="${WIDTH}" height="${HEIGHT}" role="img" aria-labelledby="title description">
<title id="title">${title}</title>
<desc id="description">${group.afterWrite} reads after a write, ${group.stale} stale reads in all. The line is the share of fresh reads, the band its 95% Wilson interval.</desc>
<style>
svg{background:#fff;font:12px system-ui,sans-serif;fill:#222}
.grid{stroke:#ddd}.band{fill:#1f6feb;opacity:.22}.share{fill:none;stroke:#1f6feb;stroke-width:2}.head{font-weight:600;font-size:13px}
@media (prefers-color-scheme:dark){svg{background:#111;fill:#ddd}.grid{stroke:#333}.band{fill:#6cb0ff}.share{stroke:#6cb0ff}}
</style>
<text class="head" x="${LEFT}" y="24">${escaped(short(printable(group.name)))}: share of fresh reads</text>
${[...down, ...across].join('\n')}
<path class="band" d="${band ?? ''}"/>
<path class="share" d="${share ?? ''}"/>
<text x="${(LEFT + WIDTH - RIGHT) / 2}" y="${HEIGHT - 10}" text-anchor="middle">time since the newest acknowledged write</text>
</svg>
`
}

function short(text: string): string {
  return text.length > 70 ? `${text.slice(0, 69)}…` : text
}

function escaped(text: string): string {
  return text.replace(/[&<>"']/g, (c) => `&#${c.charCodeAt(0)};`)
}
