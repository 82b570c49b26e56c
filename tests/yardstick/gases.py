"""Gas models of the witness: p = rho R T, with h(T), phi(T) and cp(T).

h    sensible enthalpy from 298.15 K [J/kg]
phi  temperature part of the entropy, integral of cp dT / T [J/(kg K)]; s = phi(T) - R ln p
cp   specific heat at constant pressure [J/(kg K)]

Air: mole fractions N2 0.78084, O2 0.20946, Ar 0.00934, CO2 0.0004, normalised to one; seven-coefficient
polynomials of NASA TM-4513 (McBride, Gordon & Reno 1993):
cp/R = a0 + a1 T + ... + a4 T^4;  h/(R T) = a0 + a1 T/2 + ... + a4 T^4/5 + a5/T;
s/R = a0 ln T + a1 T + a2 T^2/2 + ... + a6.
"""

from mpmath import mp, mpf

MOLAR_GAS_CONSTANT = "8.31446261815324"  # J/(mol K), exact in the SI (CODATA 2018)
REFERENCE_TEMPERATURE = "298.15"  # K

# Abridged standard atomic weights, IUPAC 2021 [g/mol].
ATOMIC_WEIGHTS = {"N": "14.007", "O": "15.999", "C": "12.011", "Ar": "39.95"}

# species: mole fraction, atoms, T_mid [K], coefficients below and above T_mid
AIR = {
    "N2": ("0.78084", {"N": 2}, "1000",
           "3.53100528 -0.000123660987 -5.02999437e-07 2.43530612e-09 -1.40881235e-12 -1046.97628 2.96747468",
           "2.95257626 0.00139690057 -4.92631691e-07 7.86010367e-11 -4.60755321e-15 -923.948645 5.87189252"),
    "O2": ("0.20946", {"O": 2}, "1000",
           "3.78245636 -0.00299673415 9.847302e-06 -9.68129508e-09 3.24372836e-12 -1063.94356 3.65767573",
           "3.66096083 0.000656365523 -1.41149485e-07 2.05797658e-11 -1.29913248e-15 -1215.97725 3.41536184"),
    "Ar": ("0.00934", {"Ar": 1}, "6000",
           "2.5 0.0 0.0 0.0 0.0 -745.375 4.37967491",
           "2.5 0.0 0.0 0.0 0.0 -745.375 4.37967491"),
    "CO2": ("0.0004", {"C": 1, "O": 2}, "1000",
           "2.35677352 0.00898459677 -7.12356269e-06 2.45919022e-09 -1.43699548e-13 -48371.9697 9.90105222",
           "4.63659493 0.00274131991 -9.95828531e-07 1.60373011e-10 -9.16103468e-15 -49024.9341 -1.93534855"),
}


class Perfect:
    """Constant ratio of specific heats `gamma` and gas constant `R` [J/(kg K)]."""

    def __init__(self, gamma, R):
        self.gamma_, self.R = mpf(gamma), mpf(R)
        self.cp_ = self.gamma_ * self.R / (self.gamma_ - 1)

    def cp(self, T):
        return self.cp_

    def h(self, T):
        return self.cp_ * (T - mpf(REFERENCE_TEMPERATURE))

    def phi(self, T):
        return self.cp_ * mp.log(T)

    def temperature(self, h, guess):
        return h / self.cp_ + mpf(REFERENCE_TEMPERATURE)


class Air:
    """Dry air, thermally perfect."""

    def __init__(self):
        total = sum(mpf(row[0]) for row in AIR.values())
        molar_mass = mpf(0)
        self.parts = []
        for x, atoms, t_mid, low, high in AIR.values():
            x = mpf(x) / total
            molar_mass += x * sum(k * mpf(ATOMIC_WEIGHTS[a]) for a, k in atoms.items()) / 1000
            self.parts.append((x, mpf(t_mid), [mpf(c) for c in low.split()], [mpf(c) for c in high.split()]))
        self.R = mpf(MOLAR_GAS_CONSTANT) / molar_mass
        self.h0 = self._h(mpf(REFERENCE_TEMPERATURE))

    def _coefficients(self, T):
        for x, t_mid, low, high in self.parts:
            yield x, (low if T <= t_mid else high)

    def cp(self, T):
        return self.R * sum(x * mp.polyval(a[4::-1], T) for x, a in self._coefficients(T))

    def _h(self, T):
        return self.R * sum(
            x * (T * mp.polyval([a[k] / (k + 1) for k in range(4, -1, -1)], T) + a[5])
            for x, a in self._coefficients(T))

    def h(self, T):
        return self._h(T) - self.h0

    def phi(self, T):
        return self.R * sum(
            x * (a[0] * mp.log(T) + T * mp.polyval([a[k] / k for k in range(4, 0, -1)], T) + a[6])
            for x, a in self._coefficients(T))

    def temperature(self, h, guess):
        """The temperature at which the sensible enthalpy is h, by Newton's method."""
        T = guess
        for _ in range(60):
            step = (self.h(T) - h) / self.cp(T)
            T -= step
            if abs(step) < abs(T) * mpf(10) ** (6 - mp.dps):
                return T
        raise ArithmeticError("temperature from enthalpy: no convergence")


def gas_of(entry):
    """The gas written as "air" or as a table."""
    from quantities import quantity

    if entry == "air":
        return Air()
    if "gas_constant" in entry:
        return Perfect(entry["gamma"], quantity(entry["gas_constant"]))
    return Perfect(entry["gamma"], mpf(MOLAR_GAS_CONSTANT) / quantity(entry["molar_mass"]))
