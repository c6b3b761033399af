import { almanac } from '../../almanac.ts';
import { cellsData } from '../../cells-data.ts';

export const GET = (): Response =>
  new Response(`window.sweepAlmanacCells=${JSON.stringify(cellsData(almanac())).replaceAll('</', '<\\/')};\n`);
