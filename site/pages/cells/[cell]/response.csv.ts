import { almanac } from '../../../almanac.ts';
import { responseCsv } from '../../../cell/downloads.ts';
import { responseSweep } from '../../../example.ts';

const sweepOf = (id: string) => responseSweep(almanac().cell(id), almanac().sweeps(id));

/** Only cells with a measured response to a small step have this file. */
export function getStaticPaths() {
  return [...almanac().cellNames]
    .filter(([id]) => sweepOf(id) !== null)
    .map(([id, name]) => ({ params: { cell: name }, props: { id } }));
}

export const GET = ({ props }: { props: { id: string } }): Response => new Response(responseCsv(sweepOf(props.id)!));
