/** Progress for people: a bar on a terminal, plain lines elsewhere, nothing when quiet. Written to stderr. */
import { SingleBar } from 'cli-progress';

export interface Bar {
  step(what: string): void;
  done(): void;
}

export interface Progress {
  /** A stage with `total` steps; a total of 0 says nothing. */
  start(title: string, total: number): Bar;
  /** One line. */
  say(line: string): void;
}

const nothing: Bar = { step: () => {}, done: () => {} };

export const silent: Progress = { start: () => nothing, say: () => {} };

export function progressFor(stream: NodeJS.WriteStream, quiet: boolean): Progress {
  if (quiet) return silent;
  const say = (line: string): void => {
    stream.write(`${line}\n`);
  };
  return {
    say,
    start: (title, total) =>
      total === 0 ? nothing : stream.isTTY ? bar(title, total, stream) : lines(title, total, say),
  };
}

function bar(title: string, total: number, stream: NodeJS.WriteStream): Bar {
  const drawn = new SingleBar({
    format: `${title.padEnd(20)} {bar} {value}/{total}  {what}`,
    barCompleteChar: '▪',
    barIncompleteChar: '·',
    barsize: 28,
    hideCursor: true,
    clearOnComplete: false,
    stream,
    stopOnComplete: false,
  });
  drawn.start(total, 0, { what: '' });
  return {
    step: (what) => drawn.increment(1, { what: what.slice(-40) }),
    done: () => {
      drawn.update({ what: '' });
      drawn.stop();
    },
  };
}

/** Ten lines at most for a stage, so that a log stays readable. */
function lines(title: string, total: number, say: (line: string) => void): Bar {
  let done = 0;
  let said = 0;
  return {
    step: () => {
      done += 1;
      const tenth = Math.floor((10 * done) / total);
      if (tenth > said) {
        said = tenth;
        say(`${title}: ${done} of ${total}`);
      }
    },
    done: () => {},
  };
}
