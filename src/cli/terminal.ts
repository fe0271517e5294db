/**
 * The streams of a run, in one replaceable object: a test gives its own.
 */
export interface Terminal {
  readonly out: NodeJS.WritableStream
  readonly err: NodeJS.WritableStream
  readonly input: NodeJS.ReadableStream
  /** columns of standard output, 100 when it is no terminal */
  readonly width: number
  readonly colour: boolean
  /** whether progress may be shown on standard error */
  readonly progress: boolean
  /** asked to stop */
  readonly signal: AbortSignal
}

/** The terminal of this process. Colour obeys NO_COLOR and FORCE_COLOR. */
export function processTerminal(signal: AbortSignal): Terminal {
  const { stdout, stderr, stdin, env } = process
  const forced = env.FORCE_COLOR !== undefined && env.FORCE_COLOR !== '' && env.FORCE_COLOR !== '0'
  const colour = env.NO_COLOR ? false : forced || (stdout.isTTY === true && env.TERM !== 'dumb')
  return {
    out: stdout,
    err: stderr,
    input: stdin,
    width: stdout.columns ?? (Number(env.COLUMNS) || 100),
    colour,
    progress: stderr.isTTY === true,
    signal,
  }
}

/** Writes and waits until the stream has taken it. */
export function write(stream: NodeJS.WritableStream, text: string): Promise<void> {
  return new Promise((resolve, reject) => {
    stream.write(text, (error) => {
      // A reader that has had enough closes the pipe: that is no failure.
      const { code } = (error ?? {}) as NodeJS.ErrnoException
      if (error && code !== 'EPIPE' && code !== 'ERR_STREAM_DESTROYED') reject(error)
      else resolve()
    })
  })
}
