#!/usr/bin/env node
/**
 * The program as a process: its streams, signals and exit status.
 */
import { run } from './main.js'
import { processTerminal } from './terminal.js'

const controller = new AbortController()
// The first interrupt stops the check and prints what was found; the second ends at once.
process.once('SIGINT', () => {
  controller.abort()
  process.once('SIGINT', () => process.exit(130))
})
// A reader that has had enough closes the pipe: go on quietly, so that the exit status still tells the verdict.
process.stdout.on('error', (error: NodeJS.ErrnoException) => {
  if (error.code !== 'EPIPE') throw error
})
process.exitCode = await run(process.argv.slice(2), processTerminal(controller.signal))
