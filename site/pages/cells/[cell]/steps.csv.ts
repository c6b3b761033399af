import { almanac } from '../../../almanac.ts';
import { stepsCsv } from '../../../cell/downloads.ts';

/** Only cells that were given steps have this file. */
export function getStaticPaths() {
  const { cellNames, cell } = almanac();
  return [...cellNames]
    .filter(([id]) => (cell(id).measure.conditions[0]?.vi.length ?? 0) > 0)
    .map(([id, name]) => ({ params: { cell: name }, props: { id } }));
}

export const GET = ({ props }: { props: { id: string } }): Response =>
  new Response(stepsCsv(almanac().cell(props.id), almanac().sweeps(props.id)));
