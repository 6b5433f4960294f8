"""Constants that several topics share: each is a cell with a defined name on the Constants tab."""

from sheetcal.cells.registry import Constant

_IUPAC = "IUPAC conventional atomic weights"
_FACTOR = "unit conversion, exact"

ABSOLUTE_ZERO = Constant(-273.15, "degC", name="absolute_zero", source="SI, exact")
R = Constant(8.31446261815324, "J/(mol K)", name="gas_constant", source="SI 2019, exact")
J_PER_KJ = Constant(1000.0, "J/kJ", name="joule_per_kilojoule", source=_FACTOR)
MG_PER_G = Constant(1000.0, "mg/g", name="milligram_per_gram", source=_FACTOR)
ML_PER_L = Constant(1000.0, "mL/L", name="millilitre_per_litre", source=_FACTOR)
KPA_CM3_PER_J = Constant(1000.0, "kPa cm3/J", name="kilopascal_cm3_per_joule", source=_FACTOR)
KPA_PER_MPA = Constant(1000.0, "kPa/MPa", name="kilopascal_per_megapascal", source=_FACTOR)
J_PER_G_PER_MJ_PER_KG = Constant(1000.0, "J kg/(g MJ)", name="joule_per_gram_in_mj_per_kg", source=_FACTOR)

M_H = Constant(1.008, "g/mol", name="atomic_weight_hydrogen", source=_IUPAC)
M_C = Constant(12.011, "g/mol", name="atomic_weight_carbon", source=_IUPAC)
M_N = Constant(14.007, "g/mol", name="atomic_weight_nitrogen", source=_IUPAC)
M_O = Constant(15.999, "g/mol", name="atomic_weight_oxygen", source=_IUPAC)
M_S = Constant(32.06, "g/mol", name="atomic_weight_sulfur", source=_IUPAC)
M_CL = Constant(35.45, "g/mol", name="atomic_weight_chlorine", source=_IUPAC)
M_WATER = Constant(18.015, "g/mol", name="molar_mass_water", source=_IUPAC)
WATER_VAPORISATION = Constant(
    44004.0,
    "J/mol",
    name="water_vaporisation",
    source="CODATA 1989: H2O gas -241.826, liquid -285.830 kJ/mol",
)
