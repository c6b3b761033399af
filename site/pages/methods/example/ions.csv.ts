import { stringify } from 'csv-stringify/sync';
import { almanac } from '../../../almanac.ts';
import { exampleOf } from '../../../example.ts';

/** Ions of the example's solutions; a head row alone where there are none. */
export function GET(): Response {
  const all = almanac();
  const example = exampleOf(all);
  const solution = example ? (all.cell(example.cell.id).circumstances[0]?.solution ?? null) : null;
  const head = ['ion', 'valence', 'mobility_relative_to_potassium', 'pipette_mm', 'bath_mm', 'celsius'];
  const nine = (value: number): number => Number(value.toPrecision(9));
  const rows = (solution?.ions ?? []).map((ion) => [
    ion.ion,
    ion.valence,
    nine(ion.mobility),
    nine(ion.pipette_mm),
    nine(ion.bath_mm),
    solution!.celsius,
  ]);
  return new Response(stringify([head, ...rows], { record_delimiter: '\r\n' }));
}
