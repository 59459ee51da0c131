/**
 * The one physical convention of the project. Every other file relies on it and none restates it differently.
 *
 * - Fields vary as exp(+jωt). A unit delay T = 1/FSR multiplies by z⁻¹ = exp(−jΩ), with Ω = 2π·offset/FSR and
 *   offset = ν − ν₀ in GHz from the chip's reference frequency ν₀. H(z) = Σ bₖz⁻ᵏ / Σ aₖz⁻ᵏ, a₀ = 1.
 * - Coupler of power cross-coupling K: [[√(1−K), −j√K], [−j√K, √(1−K)]], both outputs times its excess loss.
 * - Phase shifter φ: exp(−jφ). Heat lengthens the path: more heat, more φ.
 * - Waveguide of loss L dB (power): amplitude 10^(−L/20).
 * - Ring: coupler whose out2 returns to its in2 through one unit delay: (t − x)/(1 − t·x), t = √(1−K),
 *   x = a·exp(−j(Ω+φ)); pole at t·a·exp(−jφ).
 * - Nothing reflects. A passive circuit never has |H| > 1; the two outputs of a lossless one sum to 1 in power.
 * - Two equal 0.5 couplers: in1→out1 (bar) = (A₀ − A₁e^{−jφ})/2, in1→out2 (cross) = −j(A₀ + A₁e^{−jφ})/2.
 * - Grids inside the core are offsets from ν₀ in GHz (or Ω in rad): absolute THz costs digits for small FSR.
 * - Wavelengths are vacuum wavelengths.
 */

/** Speed of light in vacuum, m/s. Exact by definition (SI Brochure, 9th ed., 2019). */
const SPEED_OF_LIGHT = 299_792_458;

/** nm·THz: λ[nm] = this / ν[THz]. */
export const NM_THZ = SPEED_OF_LIGHT * 1e-3;

/** The half-power level in dB, the edge of a Butterworth band. */
export const HALF_POWER_DB = 10 * Math.log10(2);

/** dB below which a transmission is not told apart from nothing on the wire. */
export const FLOOR_DB = -200;

/** Names the numerical behaviour of this core. Raised by hand when a golden result moves; part of every design's address. */
export const ENGINE_VERSION = '1';
