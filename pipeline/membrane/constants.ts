/** Physical constants. All are exact in the 2019 SI (BIPM, SI Brochure, 9th edition). */

/** Boltzmann constant, J/K. */
export const boltzmannJPerK = 1.380649e-23;

/** Elementary charge, C. */
export const elementaryChargeC = 1.602176634e-19;

/** Avogadro constant, 1/mol. */
export const avogadroPerMol = 6.02214076e23;

/** Molar gas constant, J/(mol K): N_A·k. */
export const gasConstantJPerMolK = avogadroPerMol * boltzmannJPerK;

/** Faraday constant, C/mol: N_A·e. */
export const faradayCPerMol = avogadroPerMol * elementaryChargeC;

/** 0 °C in kelvin. */
export const zeroCelsiusK = 273.15;
