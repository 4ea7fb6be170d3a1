import pc from 'picocolors';
import { BuildError, problemText } from '../../runtime/contract.js';
import { RecordingError } from '../../runtime/recording/format.js';
import { exitCode } from '../../runtime/verdict.js';
import { clean } from '../terminal/text.js';

/** Something that the user asked for cannot be had; `code` is the exit code. */
export class CommandError extends Error {
  override readonly name = 'CommandError';
  constructor(
    message: string,
    readonly code: number = exitCode.badInput,
  ) {
    super(message);
  }
}

/** Says on standard error what is wrong; the exit code. */
export function complain(error: unknown): number {
  if (error instanceof BuildError) {
    for (const problem of error.problems)
      process.stderr.write(`${pc.red('error')} ${printable(problemText(problem))}\n`);
    if (error.problems.length > 1) process.stderr.write(`${error.problems.length} errors\n`);
    return exitCode.badInput;
  }
  if (error instanceof CommandError || error instanceof RecordingError) {
    process.stderr.write(`${pc.red('error')} ${printable(error.message)}\n`);
    return error instanceof CommandError ? error.code : exitCode.badInput;
  }
  const { code, message } = error as NodeJS.ErrnoException;
  if (code === 'ENOENT' || code === 'EACCES' || code === 'EISDIR') {
    process.stderr.write(`${pc.red('error')} ${printable(message)}: name a file that exists and may be read\n`);
    return exitCode.badInput;
  }
  process.stderr.write(
    `${pc.red('error')} ${printable(error instanceof Error ? (error.stack ?? error.message) : String(error))}\n`,
  );
  return exitCode.unfinished;
}

/** Lines of text from files and names, without what a terminal would act on. */
export function printable(text: string): string {
  return text.split('\n').map(clean).join('\n');
}
