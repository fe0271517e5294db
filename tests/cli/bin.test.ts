import { spawn } from 'node:child_process'
import { once } from 'node:events'
import { fileURLToPath } from 'node:url'
import { describe, expect, it } from 'vitest'

const ROOT = fileURLToPath(new URL('../..', import.meta.url))

/** Starts the program as a process of its own. */
function start(...args: string[]) {
  return spawn(process.execPath, ['--import', 'tsx', 'src/cli/bin.ts', ...args], { cwd: ROOT })
}

describe('the program as a process', () => {
  it('keeps the exit status of the verdict when the reader closes the pipe early', async () => {
    const child = start('check', 'histories/redis-replica.ndjson.gz', '--format', 'json')
    let complaints = ''
    child.stderr.setEncoding('utf8').on('data', (text: string) => {
      complaints += text
    })
    child.stdout.destroy()
    const [status] = await once(child, 'close')
    expect({ status, complaints }).toEqual({ status: 1, complaints: '' })
  }, 30_000)

  it('reads a history from standard input and ends with the status of its verdict', async () => {
    const child = start('check', '-')
    child.stdin.end('{"client":"A","op":"read","key":"berth/1","value":null,"start":1,"end":2}\n')
    child.stdout.resume()
    const [status] = await once(child, 'close')
    expect(status).toBe(0)
  }, 30_000)
})
