/** Stands in for the reading worker: the file's name says how it misbehaves. */
import { parentPort } from 'node:worker_threads';

parentPort?.on('message', (task: { file: string }) => {
  if (task.file === 'hangs') for (;;);
  if (task.file === 'dies') process.exit(3);
  if (task.file === 'throws') throw new Error('out of bounds');
  if (task.file === 'slow but alive') {
    let done = 0;
    const timer = setInterval(() => {
      parentPort?.postMessage({ kind: 'progress', done: ++done, of: 6 });
      if (done === 6) {
        clearInterval(timer);
        parentPort?.postMessage({ kind: 'measured', sweeps: {} });
      }
    }, 150);
    return;
  }
  parentPort?.postMessage({ kind: 'measured', sweeps: {} });
});
