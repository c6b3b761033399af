/** The pH that 5 % carbon dioxide gives a bicarbonate solution. */
import { zeroCelsiusK } from './constants.ts';
import { requireCelsius, requireConcentration } from './guards.ts';

/** Share of carbon dioxide in carbogen, and the pressure it is bubbled at, mmHg. */
const carbogenShare = 0.05;
const pressureMmhg = 760;

/** Saturated water vapour, mmHg (Antoine equation, 1–100 °C; from memory). */
const vapourMmhg = (celsius: number): number => 10 ** (8.07131 - 1730.63 / (233.426 + celsius));

/** First constant of carbonic acid without ionic strength (Harned & Davis 1943, J Am Chem Soc 65:2030; from memory). */
const firstConstant = (kelvin: number): number => 3404.71 / kelvin + 0.032786 * kelvin - 14.8435;

/**
 * pH of a bicarbonate solution in equilibrium with carbogen (5 % carbon dioxide) at sea level:
 * pK′ + log₁₀(HCO₃/(s·pCO₂)), pK′ 6.10 and s 0.0307 mmol/L per mmHg at 37 °C (plasma values, from memory), moved to
 * other temperatures as the constant of Harned & Davis and the solubility of carbon dioxide in water (ΔH/R = −2400 K,
 * from memory) move.
 * @param bicarbonateMm mmol/L, above 0
 * @param celsius temperature, °C, above absolute zero
 * @throws RangeError naming the argument
 * @example carbogenPh(25, 37) // 7.46
 */
export function carbogenPh(bicarbonateMm: number, celsius: number): number {
  requireConcentration('bicarbonateMm', bicarbonateMm);
  const kelvin = requireCelsius('celsius', celsius) + zeroCelsiusK;
  const body = 37 + zeroCelsiusK;
  const constant = 6.1 + firstConstant(kelvin) - firstConstant(body);
  const solubility = 0.0307 * Math.exp(2400 * (1 / kelvin - 1 / body));
  const carbonDioxide = solubility * carbogenShare * (pressureMmhg - vapourMmhg(celsius));
  return constant + Math.log10(bicarbonateMm / carbonDioxide);
}
