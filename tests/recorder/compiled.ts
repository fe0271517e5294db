/**
 * The recorder and the program that drives it as plain JavaScript, so that a child process starts in milliseconds
 * and dozens can be killed.
 */
import { mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs'
import { dirname, join } from 'node:path'
import ts from 'typescript'

/** Compiles into `folder`, laid out as the sources are. Gives back the path of the driving program. */
export function compileBusyRecorder(folder: string): string {
  const program = 'tests/recorder/busy-recorder.ts'
  const files = [
    'src/history/lines.ts',
    program,
    ...readdirSync('src/recorder').map((name) => `src/recorder/${name}`),
  ]
  const compiled = (file: string): string => join(folder, file.replace(/\.ts$/, '.js'))
  for (const file of files) {
    const { outputText } = ts.transpileModule(readFileSync(file, 'utf8'), {
      compilerOptions: {
        module: ts.ModuleKind.ESNext,
        target: ts.ScriptTarget.ES2022,
        verbatimModuleSyntax: true,
      },
    })
    mkdirSync(dirname(compiled(file)), { recursive: true })
    writeFileSync(compiled(file), outputText)
  }
  writeFileSync(join(folder, 'package.json'), '{"type":"module"}')
  return compiled(program)
}
