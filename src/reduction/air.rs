//! Air and vacuum wavelengths as types, and the refractive index between them.
//!
//! The library and the model work in standard air: dry, 15 °C, 101325 Pa, 450 ppm CO₂.
//! Wavenumbers are vacuum by definition.

use serde::{Deserialize, Serialize};
use std::ops::RangeInclusive;

/// Wavelengths that can be held, nm.
pub const RANGE_NM: RangeInclusive<f64> = 100.0..=20_000.0;

/// Below this vacuum wavelength (nm) the index keeps its value. The dispersion formula was fitted
/// above 230 nm and has a pole at 132 nm; holding it makes the conversions continuous and
/// invertible over the whole of [`RANGE_NM`].
const INDEX_HELD_BELOW_NM: f64 = 200.0;

/// A wavelength in standard air (15 °C, 101325 Pa, dry, 450 ppm CO₂), nm.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Serialize, Deserialize)]
#[serde(try_from = "f64", into = "f64")]
pub struct AirWavelength(f64);

impl AirWavelength {
    /// A wavelength in standard air, nm. `None` unless it is finite and within [`RANGE_NM`].
    pub fn new(nm: f64) -> Option<Self> {
        RANGE_NM.contains(&nm).then_some(Self(nm))
    }

    /// The wavelength, nm.
    pub fn nm(self) -> f64 {
        self.0
    }

    /// The same light in vacuum. The index belongs to the vacuum wavelength, so the equation
    /// λ_vac = n(λ_vac)·λ_air is iterated; a step shrinks the error by more than a thousand, and
    /// five reach the last digit.
    pub fn to_vacuum(self) -> VacuumWavelength {
        let mut vacuum_nm = self.0;
        for _ in 0..5 {
            vacuum_nm = self.0 * standard_index(vacuum_nm);
        }
        VacuumWavelength(vacuum_nm)
    }
}

impl From<AirWavelength> for f64 {
    fn from(wavelength: AirWavelength) -> Self {
        wavelength.0
    }
}

impl TryFrom<f64> for AirWavelength {
    type Error = &'static str;

    fn try_from(nm: f64) -> Result<Self, Self::Error> {
        Self::new(nm).ok_or("not a wavelength in air")
    }
}

/// A wavelength in vacuum, nm.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct VacuumWavelength(f64);

impl VacuumWavelength {
    /// A wavelength in vacuum, nm. `None` unless it is finite and within [`RANGE_NM`].
    pub fn new(nm: f64) -> Option<Self> {
        RANGE_NM.contains(&nm).then_some(Self(nm))
    }

    /// From a wavenumber in vacuum, cm⁻¹: λ = 10⁷/ν. `None` unless the wavelength is finite and
    /// within [`RANGE_NM`].
    pub fn from_wavenumber(per_cm: f64) -> Option<Self> {
        Self::new(1e7 / per_cm)
    }

    /// The wavelength, nm.
    pub fn nm(self) -> f64 {
        self.0
    }

    /// The wavenumber, cm⁻¹.
    pub fn wavenumber(self) -> f64 {
        1e7 / self.0
    }

    /// The same light in standard air: λ_air = λ_vac/n(λ_vac).
    pub fn to_air(self) -> AirWavelength {
        AirWavelength(self.0 / standard_index(self.0))
    }
}

/// Refractive index of standard air for a vacuum wavelength in nm:
///
/// n − 1 = 0.05792105/(238.0185 − s) + 0.00167917/(57.362 − s),
///
/// s = λ⁻² with λ in µm. P. E. Ciddor, Appl. Opt. 35, 1566 (1996), eq. 1.
fn standard_index(vacuum_nm: f64) -> f64 {
    let per_um = 1e3 / vacuum_nm.max(INDEX_HELD_BELOW_NM);
    1.0 + standard_refractivity(per_um * per_um)
}

/// The right-hand side of Ciddor's eq. 1; `s` in µm⁻².
fn standard_refractivity(s: f64) -> f64 {
    0.057_921_05 / (238.0185 - s) + 0.001_679_17 / (57.362 - s)
}

/// Refractive index of moist air in the state of a given room, for readings that were corrected
/// with another air than the standard one.
///
/// `vacuum_nm` is the vacuum wavelength in nm (200 to 2000; measured from 230 to 1690),
/// `temperature_c` in °C (−40 to 100), `pressure_pa` in Pa (10⁴ to 1.4·10⁵), `relative_humidity`
/// a fraction (0 to 1), `co2_ppm` in µmol/mol (0 to 2000). `None` outside those ranges.
///
/// n − 1 = (ρ_a/ρ_axs)(n_axs − 1) + (ρ_v/ρ_vs)(n_vs − 1): dry air (a) and water vapour (v), each
/// scaled from its standard density. P. E. Ciddor, Appl. Opt. 35, 1566 (1996), with saturation
/// pressures after IAPWS as in the NIST Engineering Metrology Toolbox.
pub fn refractive_index_air(
    vacuum_nm: f64,
    temperature_c: f64,
    pressure_pa: f64,
    relative_humidity: f64,
    co2_ppm: f64,
) -> Option<f64> {
    let usable = (200.0..=2000.0).contains(&vacuum_nm)
        && (-40.0..=100.0).contains(&temperature_c)
        && (1e4..=1.4e5).contains(&pressure_pa)
        && (0.0..=1.0).contains(&relative_humidity)
        && (0.0..=2000.0).contains(&co2_ppm);
    if !usable {
        return None;
    }
    const GAS_CONSTANT: f64 = 8.314_472; // J/(mol K), the value the equation was published with
    const WATER_KG_PER_MOL: f64 = 0.018_015;
    const STANDARD_WATER_DENSITY: f64 = 0.009_859_38; // kg/m³ at 20 °C, 1333 Pa
    const STANDARD_AIR_COMPRESSIBILITY: f64 = 0.999_592_211_5; // at 15 °C, 101325 Pa

    let s = (1e3 / vacuum_nm).powi(2);
    let kelvin = temperature_c + 273.15;
    let vapour = vapour_mole_fraction(temperature_c, pressure_pa, relative_humidity);
    // A mole fraction above one means that no such air exists (steam at low pressure).
    if vapour > 1.0 {
        return None;
    }
    let dry_kg_per_mol = 1e-3 * (28.9635 + 12.011e-6 * (co2_ppm - 400.0));
    let dry = standard_refractivity(s) * (1.0 + 0.534e-6 * (co2_ppm - 450.0));
    let water = 1.022e-8 * (295.235 + 2.6422 * s - 0.032_380 * s.powi(2) + 0.004_028 * s.powi(3));

    let moles_per_m3 =
        pressure_pa / (compressibility(temperature_c, pressure_pa, vapour) * GAS_CONSTANT * kelvin);
    let standard_moles_per_m3 = 101_325.0 / (STANDARD_AIR_COMPRESSIBILITY * GAS_CONSTANT * 288.15);
    let dry_density = (1.0 - vapour) * moles_per_m3 * dry_kg_per_mol;
    let standard_dry_density = standard_moles_per_m3 * dry_kg_per_mol;
    let water_density = vapour * moles_per_m3 * WATER_KG_PER_MOL;
    Some(
        1.0 + dry_density / standard_dry_density * dry
            + water_density / STANDARD_WATER_DENSITY * water,
    )
}

/// Mole fraction of water vapour: enhancement factor × humidity × saturation pressure / pressure.
fn vapour_mole_fraction(temperature_c: f64, pressure_pa: f64, relative_humidity: f64) -> f64 {
    let enhancement = 1.000_62 + 3.14e-8 * pressure_pa + 5.60e-7 * temperature_c.powi(2);
    enhancement * relative_humidity * saturation_pressure(temperature_c) / pressure_pa
}

/// Saturation pressure of water vapour, Pa: over water from 0 °C, over ice below (IAPWS).
fn saturation_pressure(temperature_c: f64) -> f64 {
    let kelvin = temperature_c + 273.15;
    if temperature_c < 0.0 {
        let theta = kelvin / 273.16;
        let exponent =
            -13.928_169 * (1.0 - theta.powf(-1.5)) + 34.707_823_8 * (1.0 - theta.powf(-1.25));
        return 611.657 * exponent.exp();
    }
    let omega = kelvin - 0.238_555_575_678 / (kelvin - 650.175_348_448);
    let a = omega.powi(2) + 1_167.052_145_28 * omega - 724_213.167_032;
    let b = -17.073_846_940_1 * omega.powi(2) + 12_020.824_702_4 * omega - 3_232_555.032_23;
    let c = 14.915_108_613_5 * omega.powi(2) - 4_823.265_735_77 * omega + 405_113.405_421;
    let x = -b + (b * b - 4.0 * a * c).sqrt();
    1e6 * (2.0 * c / x).powi(4)
}

/// Compressibility of moist air (Ciddor 1996, eq. 12); `vapour` is a mole fraction.
fn compressibility(temperature_c: f64, pressure_pa: f64, vapour: f64) -> f64 {
    let t = temperature_c;
    let pressure_per_kelvin = pressure_pa / (t + 273.15);
    let linear = 1.581_23e-6 - 2.9331e-8 * t
        + 1.1043e-10 * t * t
        + (5.707e-6 - 2.051e-8 * t) * vapour
        + (1.9898e-4 - 2.376e-6 * t) * vapour * vapour;
    let square = 1.83e-11 - 0.765e-8 * vapour * vapour;
    1.0 - pressure_per_kelvin * linear + pressure_per_kelvin.powi(2) * square
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// Largest error of a there-and-back conversion, nm.
    const ROUND_TRIP_NM: f64 = 1e-7;

    #[test]
    fn only_finite_wavelengths_in_range_can_be_built() {
        for nm in [f64::NAN, f64::INFINITY, -589.3, 0.0, 99.999, 20_000.1] {
            assert_eq!(AirWavelength::new(nm), None, "{nm}");
            assert_eq!(VacuumWavelength::new(nm), None, "{nm}");
        }
        for per_cm in [0.0, -0.0, -1.0, f64::NAN, f64::INFINITY, 499.9, 100_001.0] {
            assert_eq!(VacuumWavelength::from_wavenumber(per_cm), None, "{per_cm}");
        }
        assert_eq!(
            AirWavelength::new(100.0).map(AirWavelength::nm),
            Some(100.0)
        );
        assert!(VacuumWavelength::new(20_000.0).is_some());
    }

    /// The refractivity at 589.3 nm of dry air at 15 °C and 101325 Pa is 277.15e-6: Ciddor 1996
    /// gives 277.147, Edlén as revised by Birch and Downs 277.146 (Python package ref_index 1.0).
    #[test]
    fn standard_refractivity_at_the_sodium_lines() {
        let refractivity = 1e6 * (standard_index(589.3) - 1.0);
        assert!((refractivity - 277.15).abs() < 0.005, "{refractivity}");
    }

    /// `ref_index.vac2air(w)`, Python package ref_index 1.0, printed to ten decimals.
    #[test]
    fn standard_air_agrees_with_an_independent_implementation() {
        for (vacuum_nm, air_nm) in [
            (200.0, 199.935_262_304_5),
            (300.0, 299.912_554_906_4),
            (500.0, 499.860_551_997_0),
            (589.3, 589.136_722_338_7),
            (800.0, 799.780_022_266_6),
            (1200.0, 1_199.671_660_836_7),
            (1700.0, 1_699.535_768_424_1),
        ] {
            let air = VacuumWavelength::new(vacuum_nm).unwrap().to_air();
            // The other side computes the compressibility of standard air instead of cancelling
            // it, which leaves a relative difference of 1e-13.
            assert!(
                (air.nm() - air_nm).abs() < 1e-9,
                "{vacuum_nm}: {}",
                air.nm()
            );
        }
    }

    /// `ref_index.ciddor(nm, °C, Pa, % humidity, ppm)`, Python package ref_index 1.0. The second
    /// line is the example of that package's documentation (1.0002716285).
    #[test]
    fn moist_air_agrees_with_an_independent_implementation() {
        for (nm, celsius, pascal, percent, ppm, index) in [
            (589.3, 15.0, 101_325.0, 0.0, 450.0, 1.000_277_147_316),
            (633.0, 20.0, 101_325.0, 20.0, 450.0, 1.000_271_628_534),
            (633.0, 20.0, 101_325.0, 0.0, 450.0, 1.000_271_799_832),
            (589.3, 15.0, 101_325.0, 0.0, 400.0, 1.000_277_139_916),
            (400.0, 35.0, 80_000.0, 80.0, 600.0, 1.000_207_235_243),
            (1500.8, 20.0, 101_325.0, 50.0, 450.0, 1.000_268_189_963),
            (321.456, 20.0, 101_325.0, 50.0, 450.0, 1.000_283_542_930),
            (633.0, -20.0, 101_325.0, 50.0, 450.0, 1.000_314_890_412),
            (700.0, 40.123, 101_325.0, 90.0, 450.0, 1.000_251_354_378),
            (230.0, 10.0, 60_000.0, 30.0, 300.0, 1.000_185_482_846),
        ] {
            let ours = refractive_index_air(nm, celsius, pascal, percent / 100.0, ppm).unwrap();
            assert!(
                (ours - index).abs() < 1e-12,
                "{nm} nm, {celsius} °C: {ours:.12}"
            );
        }
    }

    /// NIST Engineering Metrology Toolbox, Ciddor calculator, as quoted in the tests of the
    /// Python package ref_index 1.0; nine decimals are printed.
    #[test]
    fn moist_air_agrees_with_the_toolbox() {
        for (nm, celsius, pascal, percent, index) in [
            (500.0, 20.0, 101_325.0, 50.0, 1.000_273_781),
            (1700.0, 20.0, 101_325.0, 50.0, 1.000_268_041),
            (633.0, 60.45, 101_325.0, 50.0, 1.000_235_516),
            (633.0, 20.0, 10_000.0, 50.0, 1.000_026_385),
            (633.0, 20.0, 101_325.0, 100.0, 1.000_270_949),
        ] {
            let ours = refractive_index_air(nm, celsius, pascal, percent / 100.0, 450.0).unwrap();
            assert!(
                (ours - index).abs() < 2e-9,
                "{nm} nm, {celsius} °C: {ours:.12}"
            );
        }
    }

    #[test]
    fn the_state_of_the_room_is_checked() {
        assert_eq!(
            refractive_index_air(f64::NAN, 15.0, 101_325.0, 0.0, 450.0),
            None
        );
        assert_eq!(refractive_index_air(589.3, 15.0, 0.0, 0.0, 450.0), None);
        assert_eq!(
            refractive_index_air(589.3, 15.0, 101_325.0, 20.0, 450.0),
            None
        );
        // Air at 100 °C and a tenth of an atmosphere cannot hold saturated steam.
        assert_eq!(
            refractive_index_air(589.3, 100.0, 10_000.0, 1.0, 450.0),
            None
        );
    }

    #[test]
    fn standard_air_is_the_dry_limit_of_moist_air() {
        for nm in [200.0, 300.0, 589.3, 2000.0] {
            let moist = refractive_index_air(nm, 15.0, 101_325.0, 0.0, 450.0).unwrap();
            assert!((moist - standard_index(nm)).abs() < 1e-12, "{nm}");
        }
    }

    proptest! {
        #[test]
        fn air_to_vacuum_and_back(nm in 100.0f64..=20_000.0) {
            let air = AirWavelength::new(nm).unwrap();
            prop_assert!((air.to_vacuum().to_air().nm() - nm).abs() < ROUND_TRIP_NM);
            prop_assert!(air.to_vacuum().nm() > nm);
        }

        #[test]
        fn wavenumber_and_back(per_cm in 500.0f64..=100_000.0) {
            // Both ends of the range may miss it by rounding.
            if let Some(vacuum) = VacuumWavelength::from_wavenumber(per_cm) {
                prop_assert!((vacuum.wavenumber() - per_cm).abs() < 1e-9 * per_cm);
                let back = vacuum.to_air().to_vacuum();
                prop_assert!((back.nm() - vacuum.nm()).abs() < ROUND_TRIP_NM);
            }
        }

        #[test]
        fn order_is_kept(a in 100.0f64..=20_000.0, step in 1e-6f64..100.0) {
            let at = |nm| VacuumWavelength::new(nm).map(|w| w.to_air().nm());
            if let (Some(low), Some(high)) = (at(a), at(a + step)) {
                prop_assert!(low < high);
            }
        }
    }
}
