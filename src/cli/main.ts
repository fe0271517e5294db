/**
 * The command line. What a command does is loaded when it is asked for, so that `--help` is quick.
 */
import { Command, CommanderError } from 'commander'
import { VERSION } from '../version.js'
import { type ExitStatus, endOf } from './exit.js'
import { budgetOption, collect, countOption, durationOption, oneOf } from './options.js'
import { type Terminal, write } from './terminal.js'

/** The program with all its commands; `end` is told the status of the one that ran. */
export function buildProgram(terminal: Terminal, end: (status: ExitStatus) => void): Command {
  const program = new Command('misread')
    .description('Checks recorded client histories of a store against what the store promised.')
    .version(VERSION)
    .showHelpAfterError('(misread --help lists the commands)')
    .addHelpText('after', '\nExample:\n  misread check histories/harbour.ndjson\n')
    .exitOverride()
    .configureOutput({
      writeOut: (text) => terminal.out.write(text),
      writeErr: (text) => terminal.err.write(text),
      getOutHelpWidth: () => terminal.width,
      getErrHelpWidth: () => terminal.width,
    })

  program
    .command('check')
    .description('decide promises and show what breaks them')
    .argument('<file...>', 'histories: .ndjson, .ndjson.gz, or - for standard input')
    .option(
      '--promise <name>',
      'promise to check, with its parameters (repeatable; default linearizable)',
      collect,
    )
    .option('--promises <file>', 'promises with their keys, YAML or JSON (docs/promises.md)')
    .option(
      '--clock-error <duration>',
      'how far clocks may be off, whatever the headers say (2ms)',
      durationOption,
    )
    .option('--keys <glob>', 'only keys that match (repeatable)', collect)
    .option(
      '--budget <budget>',
      "how long to search for an order where reads don't say what they saw, per key (10s, 1000000steps)",
      budgetOption,
    )
    .option(
      '--format <format>',
      'text, json, ndjson (findings alone, one a line), markdown or junit',
      oneOf('text', 'json', 'ndjson', 'markdown', 'junit'),
      'text',
    )
    .option('--out <dir>', 'write result, report and counterexamples to a folder')
    .option(
      '--certificate <file>',
      'write the proof of every verdict, for misread verify (docs/certificates.md)',
    )
    .option('--force', 'let --out write into a folder that is not empty, and --certificate over a file')
    .option('--baseline <result>', 'end with 1 only for findings that this earlier result does not have')
    .option('--final <file>', 'a dump of the store taken after the run, as closing reads (docs/format.md)')
    .option('--every-key', 'list every key in the result, not only those broken or undecided')
    .option('--limit <n>', 'findings in the text, and counterexample files', countOption, 20)
    .addHelpText(
      'after',
      '\nExample:\n  misread check histories/harbour.ndjson --keys "berth/*" --out findings\n',
    )
    .action(async (files: string[], options) => {
      const { runCheck } = await import('./check.js')
      end(await runCheck(files, options, terminal))
    })

  program
    .command('survey')
    .description('what is in these files')
    .argument('<file...>', 'histories: .ndjson, .ndjson.gz, or - for standard input')
    .option('--format <format>', 'text or json', oneOf('text', 'json'), 'text')
    .addHelpText('after', '\nExample:\n  misread survey histories/harbour.ndjson\n')
    .action(async (files: string[], options) => {
      const { runSurvey } = await import('./survey.js')
      end(await runSurvey(files, options, terminal))
    })
  program
    .command('freshness')
    .description('how fresh reads were: the read-after-write curve, and how far stale reads were behind')
    .argument('<file...>', 'histories: .ndjson, .ndjson.gz, or - for standard input')
    .option('--keys <glob>', 'only keys that match (repeatable)', collect)
    .option(
      '--by <what>',
      'also for each key (or --keys glob), client or mark',
      oneOf('key', 'client', 'mark'),
    )
    .option(
      '--clock-error <duration>',
      'how far clocks may be off, whatever the headers say (2ms)',
      durationOption,
    )
    .option('--format <format>', 'text, json, csv or svg', oneOf('text', 'json', 'csv', 'svg'), 'text')
    .option('--out <dir>', 'write all of them to a folder')
    .option('--force', 'let --out write into a folder that is not empty')
    .addHelpText('after', '\nExample:\n  misread freshness histories/redis-replica.ndjson.gz --by client\n')
    .action(async (files: string[], options) => {
      const { runFreshness } = await import('./freshness.js')
      end(await runFreshness(files, options, terminal))
    })
  program
    .command('render')
    .description('a saved result in another format')
    .argument('<result>', 'result of misread check, JSON')
    .option(
      '--format <format>',
      'text, json, ndjson, markdown or junit',
      oneOf('text', 'json', 'ndjson', 'markdown', 'junit'),
      'text',
    )
    .option('--limit <n>', 'findings in text and Markdown', countOption, 20)
    .addHelpText('after', '\nExample:\n  misread render findings/result.json --format markdown\n')
    .action(async (result: string, options) => {
      const { runRender } = await import('./render.js')
      end(await runRender(result, options, terminal))
    })
  program
    .command('verify')
    .description('check a certificate against the history that it is about, independently of the checks')
    .argument('<certificate>', 'made by misread check --certificate')
    .requiredOption('--history <file...>', 'the histories, as they were checked, in that order')
    .option('--final <file>', 'the dump that the check was given')
    .option('--format <format>', 'text or json', oneOf('text', 'json'), 'text')
    .addHelpText(
      'after',
      '\nExample:\n  misread verify harbour.certificate.ndjson --history histories/harbour.ndjson\n',
    )
    .action(async (certificate: string, options) => {
      const { runVerify } = await import('./verify.js')
      end(await runVerify(certificate, options, terminal))
    })
  program
    .command('compare')
    .description('findings that are new, gone or still there between two results')
    .argument('<old>', 'result of an earlier check, JSON')
    .argument('<new>', 'result of a later one')
    .option('--format <format>', 'text or json', oneOf('text', 'json'), 'text')
    .addHelpText('after', '\nExample:\n  misread compare main.json build.json\n')
    .action(async (old: string, now: string, options) => {
      const { runCompare } = await import('./compare.js')
      end(await runCompare(old, now, options, terminal))
    })
  program
    .command('convert')
    .description('other logs into a history: CSV, NDJSON or OpenTelemetry spans (docs/convert.md)')
    .argument('<file...>', 'logs, plain or .gz, or - for standard input')
    .requiredOption('--mapping <file>', 'how their records become operations, YAML or JSON')
    .option('--out <file>', 'history to write, packed where its name ends in .gz (default standard output)')
    .option('--force', 'let --out write over a file that stands already')
    .addHelpText(
      'after',
      '\nExample:\n  misread convert docs/convert/requests.csv --mapping docs/convert/requests.yaml --out drill.ndjson\n',
    )
    .action(async (files: string[], options) => {
      const { runConvert } = await import('./convert.js')
      end(await runConvert(files, options, terminal))
    })
  program
    .command('rehearse')
    .description('record a history against a simulated store, with faults of your choice (docs/rehearsal.md)')
    .option('--scenario <name>', 'a scenario by its name, or a scenario file (.yaml, .json)')
    .option('--seed <n>', 'chance: the same seed makes the same history', countOption, 1)
    .option('--lasts <duration>', 'how long clients go on, whatever the scenario says (10m)', durationOption)
    .option('--out <dir>', 'folder for history.ndjson, truth.ndjson and scenario.yaml')
    .option('--gzip', 'pack the history: history.ndjson.gz')
    .option('--force', 'let --out write over what an earlier rehearsal left there')
    .option('--list', 'list the scenarios that are known by name')
    .option('--print', 'print the scenario, to start a file of your own from')
    .addHelpText('after', '\nExample:\n  misread rehearse --scenario failover --seed 7 --out rehearsal\n')
    .action(async (options) => {
      const { runRehearse } = await import('./rehearse.js')
      end(await runRehearse(options, terminal))
    })
  return program
}

/** Runs a command line and answers the exit status. Never throws. */
export async function run(args: readonly string[], terminal: Terminal): Promise<ExitStatus> {
  let status: ExitStatus = 0
  const program = buildProgram(terminal, (ended) => {
    status = ended
  })
  try {
    if (args.length === 0) program.help()
    await program.parseAsync(args, { from: 'user' })
    return status
  } catch (error) {
    if (error instanceof CommanderError) return error.exitCode === 0 ? 0 : 2
    const { status: failed, message } = endOf(error)
    await write(terminal.err, `${message}\n`)
    return failed
  }
}
