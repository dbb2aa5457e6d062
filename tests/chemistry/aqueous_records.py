"""A small body of equilibria for the tests of the solver, and the records made from it.

Constants at 25 degC, I = 0, as printed in MINTEQA2 v4 (Allison et al. 1991; US EPA 1998/2003 update, as distributed
in minteq.v4.dat), except NH3(g) (WATEQ4F, Ball and Nordstrom 1991) and HCN(g) (Henry constant 7.5 mol/kg/atm, from
memory, with HCN of MINTEQ). Aqueous: formation from components; solid and gas: dissolution to components. Columns:
product, reaction, log10 K, enthalpy of the reaction as printed in kJ/mol where known.
"""

from __future__ import annotations

import re

from carboy.model.knowledge import Equilibrium, Species, Value

COMPONENTS = {
    "H+": 1,
    "Na+": 1,
    "K+": 1,
    "Cl-": -1,
    "NO3-": -1,
    "SO4-2": -2,
    "CO3-2": -2,
    "PO4-3": -3,
    "HS-": -1,
    "NH4+": 1,
    "Acetate-": -1,
    "CN-": -1,
    "Edta-4": -4,
    "Ca+2": 2,
    "Zn+2": 2,
    "Cu+2": 2,
    "Al+3": 3,
    "Fe+3": 3,
    "Hg+2": 2,
    "Ag+": 1,
    "Pb+2": 2,
    "Ni+2": 2,
    "Cd+2": 2,
    "H3BO3": 0,
    "Phthalate-2": -2,
    "N2": 0,
}

AQUEOUS = """
S-2 ; HS- = S-2 + H+ ; -17.3 ; 49.4
OH- ; H2O = OH- + H+ ; -13.997 ; 55.81
PbOH+ ; Pb+2 + H2O = PbOH+ + H+ ; -7.597 ;
Pb(OH)2 ; Pb+2 + 2 H2O = Pb(OH)2 + 2 H+ ; -17.094 ;
Pb(OH)3- ; Pb+2 + 3 H2O = Pb(OH)3- + 3 H+ ; -28.091 ;
Pb2OH+3 ; 2 Pb+2 + H2O = Pb2OH+3 + H+ ; -6.397 ;
Pb3(OH)4+2 ; 3 Pb+2 + 4 H2O = Pb3(OH)4+2 + 4 H+ ; -23.888 ; 115.24
Pb(OH)4-2 ; Pb+2 + 4 H2O = Pb(OH)4-2 + 4 H+ ; -39.699 ;
Pb4(OH)4+4 ; 4 Pb+2 + 4 H2O = Pb4(OH)4+4 + 4 H+ ; -19.988 ; 88.24
AlOH+2 ; Al+3 + H2O = AlOH+2 + H+ ; -4.997 ; 47.81
Al(OH)2+ ; Al+3 + 2 H2O = Al(OH)2+ + 2 H+ ; -10.094 ;
Al(OH)3 ; Al+3 + 3 H2O = Al(OH)3 + 3 H+ ; -16.791 ;
Al(OH)4- ; Al+3 + 4 H2O = Al(OH)4- + 4 H+ ; -22.688 ; 173.24
ZnOH+ ; Zn+2 + H2O = ZnOH+ + H+ ; -8.997 ; 55.81
Zn(OH)2 ; Zn+2 + 2 H2O = Zn(OH)2 + 2 H+ ; -17.794 ;
Zn(OH)3- ; Zn+2 + 3 H2O = Zn(OH)3- + 3 H+ ; -28.091 ;
Zn(OH)4-2 ; Zn+2 + 4 H2O = Zn(OH)4-2 + 4 H+ ; -40.488 ;
CdOH+ ; Cd+2 + H2O = CdOH+ + H+ ; -10.097 ; 54.81
Cd(OH)2 ; Cd+2 + 2 H2O = Cd(OH)2 + 2 H+ ; -20.294 ;
Cd(OH)3- ; Cd+2 + 3 H2O = Cd(OH)3- + 3 H+ ; -32.505 ;
Cd(OH)4-2 ; Cd+2 + 4 H2O = Cd(OH)4-2 + 4 H+ ; -47.288 ;
Cd2OH+3 ; 2 Cd+2 + H2O = Cd2OH+3 + H+ ; -9.397 ; 45.81
HgOH+ ; Hg+2 + H2O = HgOH+ + H+ ; -3.397 ; 20.81
Hg(OH)3- ; Hg+2 + 3 H2O = Hg(OH)3- + 3 H+ ; -21.091 ;
CuOH+ ; Cu+2 + H2O = CuOH+ + H+ ; -7.497 ; 35.81
Cu(OH)2 ; Cu+2 + 2 H2O = Cu(OH)2 + 2 H+ ; -16.194 ;
Cu(OH)3- ; Cu+2 + 3 H2O = Cu(OH)3- + 3 H+ ; -26.879 ;
Cu(OH)4-2 ; Cu+2 + 4 H2O = Cu(OH)4-2 + 4 H+ ; -39.98 ;
Cu2(OH)2+2 ; 2 Cu+2 + 2 H2O = Cu2(OH)2+2 + 2 H+ ; -10.594 ; 76.62
AgOH ; Ag+ + H2O = AgOH + H+ ; -11.997 ;
Ag(OH)2- ; Ag+ + 2 H2O = Ag(OH)2- + 2 H+ ; -24.004 ;
NiOH+ ; Ni+2 + H2O = NiOH+ + H+ ; -9.897 ; 51.81
Ni(OH)2 ; Ni+2 + 2 H2O = Ni(OH)2 + 2 H+ ; -18.994 ;
Ni(OH)3- ; Ni+2 + 3 H2O = Ni(OH)3- + 3 H+ ; -29.991 ;
FeOH+2 ; Fe+3 + H2O = FeOH+2 + H+ ; -2.187 ; 41.81
Fe(OH)2+ ; Fe+3 + 2 H2O = Fe(OH)2+ + 2 H+ ; -4.594 ;
Fe(OH)3 ; Fe+3 + 3 H2O = Fe(OH)3 + 3 H+ ; -12.56 ; 103.8
Fe(OH)4- ; Fe+3 + 4 H2O = Fe(OH)4- + 4 H+ ; -21.588 ;
Fe2(OH)2+4 ; 2 Fe+3 + 2 H2O = Fe2(OH)2+4 + 2 H+ ; -2.854 ; 57.62
Fe3(OH)4+5 ; 3 Fe+3 + 4 H2O = Fe3(OH)4+5 + 4 H+ ; -6.288 ; 65.24
CaOH+ ; Ca+2 + H2O = CaOH+ + H+ ; -12.697 ; 64.11
PbCl+ ; Cl- + Pb+2 = PbCl+ ; 1.55 ; 8.7
PbCl2 ; 2 Cl- + Pb+2 = PbCl2 ; 2.2 ; 12
PbCl3- ; 3 Cl- + Pb+2 = PbCl3- ; 1.8 ; 4
PbCl4-2 ; 4 Cl- + Pb+2 = PbCl4-2 ; 1.46 ; 14.7695
ZnCl+ ; Cl- + Zn+2 = ZnCl+ ; 0.4 ; 5.4
ZnCl2 ; 2 Cl- + Zn+2 = ZnCl2 ; 0.6 ; 37
ZnCl3- ; 3 Cl- + Zn+2 = ZnCl3- ; 0.5 ; 39.999
ZnCl4-2 ; 4 Cl- + Zn+2 = ZnCl4-2 ; 0.199 ; 45.8566
ZnOHCl ; Cl- + Zn+2 + H2O = ZnOHCl + H+ ; -7.48 ;
CdCl+ ; Cd+2 + Cl- = CdCl+ ; 1.98 ; 1
CdCl2 ; Cd+2 + 2 Cl- = CdCl2 ; 2.6 ; 3
CdCl3- ; Cd+2 + 3 Cl- = CdCl3- ; 2.4 ; 10
CdOHCl ; Cd+2 + Cl- + H2O = CdOHCl + H+ ; -7.404 ; 18.2213
HgCl+ ; Cl- + Hg+2 = HgCl+ ; 7.3 ; -23
HgCl2 ; 2 Cl- + Hg+2 = HgCl2 ; 14 ; -52.7
HgCl3- ; 3 Cl- + Hg+2 = HgCl3- ; 15 ; -54.3
HgCl4-2 ; 4 Cl- + Hg+2 = HgCl4-2 ; 15.6 ; -61
HgClOH ; Cl- + Hg+2 + H2O = HgClOH + H+ ; 4.25 ; -3
CuCl+ ; Cl- + Cu+2 = CuCl+ ; 0.2 ; 8.3
CuCl2 ; 2 Cl- + Cu+2 = CuCl2 ; -0.26 ; 44.183
CuCl3- ; 3 Cl- + Cu+2 = CuCl3- ; -2.29 ; 57.279
CuCl4-2 ; 4 Cl- + Cu+2 = CuCl4-2 ; -4.59 ; 32.5515
AgCl ; Ag+ + Cl- = AgCl ; 3.31 ; -12
AgCl2- ; Ag+ + 2 Cl- = AgCl2- ; 5.25 ; -16
AgCl3-2 ; Ag+ + 3 Cl- = AgCl3-2 ; 5.2 ;
AgCl4-3 ; Ag+ + 4 Cl- = AgCl4-3 ; 5.51 ;
NiCl+ ; Cl- + Ni+2 = NiCl+ ; 0.408 ; 2
NiCl2 ; 2 Cl- + Ni+2 = NiCl2 ; -1.89 ;
FeCl+2 ; Cl- + Fe+3 = FeCl+2 ; 1.48 ; 23
FeCl2+ ; 2 Cl- + Fe+3 = FeCl2+ ; 2.13 ;
FeCl3 ; 3 Cl- + Fe+3 = FeCl3 ; 1.13 ;
H2S ; HS- + H+ = H2S ; 7.02 ; -22
Pb(HS)2 ; Pb+2 + 2 HS- = Pb(HS)2 ; 15.27 ;
Pb(HS)3- ; Pb+2 + 3 HS- = Pb(HS)3- ; 16.57 ;
Zn(HS)2 ; 2 HS- + Zn+2 = Zn(HS)2 ; 12.82 ;
Zn(HS)3- ; 3 HS- + Zn+2 = Zn(HS)3- ; 16.1 ;
ZnS(HS)2-2 ; 3 HS- + Zn+2 = ZnS(HS)2-2 + H+ ; 6.12 ;
Zn(HS)4-2 ; 4 HS- + Zn+2 = Zn(HS)4-2 ; 14.64 ;
ZnS(HS)- ; 2 HS- + Zn+2 = ZnS(HS)- + H+ ; 6.81 ;
CdHS+ ; Cd+2 + HS- = CdHS+ ; 8.008 ;
Cd(HS)2 ; Cd+2 + 2 HS- = Cd(HS)2 ; 15.212 ;
Cd(HS)3- ; Cd+2 + 3 HS- = Cd(HS)3- ; 17.112 ;
Cd(HS)4-2 ; Cd+2 + 4 HS- = Cd(HS)4-2 ; 19.308 ;
HgS2-2 ; Hg+2 + 2 HS- = HgS2-2 + 2 H+ ; 23.22 ;
Hg(HS)2 ; Hg+2 + 2 HS- = Hg(HS)2 ; 38.322 ;
HgHS2- ; Hg+2 + 2 HS- = HgHS2- + H+ ; 31.928 ;
Cu(HS)3- ; Cu+2 + 3 HS- = Cu(HS)3- ; 25.899 ;
AgHS ; Ag+ + HS- = AgHS ; 13.8145 ;
Ag(HS)2- ; Ag+ + 2 HS- = Ag(HS)2- ; 17.9145 ;
HSO4- ; SO4-2 + H+ = HSO4- ; 1.99 ; 22
NH4SO4- ; NH4+ + SO4-2 = NH4SO4- ; 1.03 ;
PbSO4 ; Pb+2 + SO4-2 = PbSO4 ; 2.69 ;
Pb(SO4)2-2 ; Pb+2 + 2 SO4-2 = Pb(SO4)2-2 ; 3.47 ;
AlSO4+ ; Al+3 + SO4-2 = AlSO4+ ; 3.89 ; 28
Al(SO4)2- ; Al+3 + 2 SO4-2 = Al(SO4)2- ; 4.92 ; 11.9
ZnSO4 ; SO4-2 + Zn+2 = ZnSO4 ; 2.34 ; 6.2
Zn(SO4)2-2 ; 2 SO4-2 + Zn+2 = Zn(SO4)2-2 ; 3.28 ;
CdSO4 ; Cd+2 + SO4-2 = CdSO4 ; 2.37 ; 8.7
Cd(SO4)2-2 ; Cd+2 + 2 SO4-2 = Cd(SO4)2-2 ; 3.5 ;
HgSO4 ; Hg+2 + SO4-2 = HgSO4 ; 2.418 ;
CuSO4 ; Cu+2 + SO4-2 = CuSO4 ; 2.36 ; 8.7
AgSO4- ; Ag+ + SO4-2 = AgSO4- ; 1.3 ; 6.2
NiSO4 ; Ni+2 + SO4-2 = NiSO4 ; 2.3 ; 5.8
Ni(SO4)2-2 ; Ni+2 + 2 SO4-2 = Ni(SO4)2-2 ; 0.82 ;
FeSO4+ ; Fe+3 + SO4-2 = FeSO4+ ; 4.05 ; 25
Fe(SO4)2- ; Fe+3 + 2 SO4-2 = Fe(SO4)2- ; 5.38 ; 19.2
CaSO4 ; Ca+2 + SO4-2 = CaSO4 ; 2.36 ; 7.1
NaSO4- ; Na+ + SO4-2 = NaSO4- ; 0.73 ; 1
KSO4- ; K+ + SO4-2 = KSO4- ; 0.85 ; 4.1
NH3 ; NH4+ = NH3 + H+ ; -9.244 ; 52
AgNH3+ ; Ag+ + NH4+ = AgNH3+ + H+ ; -5.934 ; -72
Ag(NH3)2+ ; Ag+ + 2 NH4+ = Ag(NH3)2+ + 2 H+ ; -11.268 ; -160
HgNH3+2 ; Hg+2 + NH4+ = HgNH3+2 + H+ ; -0.444 ;
Hg(NH3)2+2 ; Hg+2 + 2 NH4+ = Hg(NH3)2+2 + 2 H+ ; -0.688 ; -207
Hg(NH3)3+2 ; Hg+2 + 3 NH4+ = Hg(NH3)3+2 + 3 H+ ; -9.332 ; -273
Hg(NH3)4+2 ; Hg+2 + 4 NH4+ = Hg(NH3)4+2 + 4 H+ ; -17.676 ; -340
CuNH3+2 ; Cu+2 + NH4+ = CuNH3+2 + H+ ; -5.234 ; -72
NiNH3+2 ; NH4+ + Ni+2 = NiNH3+2 + H+ ; -6.514 ; -67
Ni(NH3)2+2 ; 2 NH4+ + Ni+2 = Ni(NH3)2+2 + 2 H+ ; -13.598 ; -111.6
CaNH3+2 ; Ca+2 + NH4+ = CaNH3+2 + H+ ; -9.144 ;
Ca(NH3)2+2 ; Ca+2 + 2 NH4+ = Ca(NH3)2+2 + 2 H+ ; -18.788 ;
PbNO3+ ; NO3- + Pb+2 = PbNO3+ ; 1.17 ; 2
Pb(NO3)2 ; 2 NO3- + Pb+2 = Pb(NO3)2 ; 1.4 ; -6.6
CdNO3+ ; Cd+2 + NO3- = CdNO3+ ; 0.5 ; -21
Cd(NO3)2 ; Cd+2 + 2 NO3- = Cd(NO3)2 ; 0.2 ;
HgNO3+ ; Hg+2 + NO3- = HgNO3+ ; -0.4327 ;
Hg(NO3)2 ; Hg+2 + 2 NO3- = Hg(NO3)2 ; -0.814 ;
CuNO3+ ; Cu+2 + NO3- = CuNO3+ ; 0.5 ; -4.1
Cu(NO3)2 ; Cu+2 + 2 NO3- = Cu(NO3)2 ; -0.4 ;
ZnNO3+ ; NO3- + Zn+2 = ZnNO3+ ; 0.4 ; -4.6
Zn(NO3)2 ; 2 NO3- + Zn+2 = Zn(NO3)2 ; -0.3 ;
AgNO3 ; Ag+ + NO3- = AgNO3 ; -0.1 ; 22.6
NiNO3+ ; NO3- + Ni+2 = NiNO3+ ; 0.4 ;
FeNO3+2 ; Fe+3 + NO3- = FeNO3+2 ; 1 ; -37
CaNO3+ ; Ca+2 + NO3- = CaNO3+ ; 0.5 ; -5.4
HCN ; CN- + H+ = HCN ; 9.21 ; -43.63
CdCN+ ; CN- + Cd+2 = CdCN+ ; 6.01 ; -30
Cd(CN)2 ; 2 CN- + Cd+2 = Cd(CN)2 ; 11.12 ; -54.3
Cd(CN)3- ; 3 CN- + Cd+2 = Cd(CN)3- ; 15.65 ; -90.3
Cd(CN)4-2 ; 4 CN- + Cd+2 = Cd(CN)4-2 ; 17.92 ; -112
HgCN+ ; CN- + Hg+2 = HgCN+ ; 17 ; -97
Hg(CN)2 ; 2 CN- + Hg+2 = Hg(CN)2 ; 32.75 ; 194
Hg(CN)3- ; 3 CN- + Hg+2 = Hg(CN)3- ; 36.31 ; -223
Hg(CN)4-2 ; 4 CN- + Hg+2 = Hg(CN)4-2 ; 38.97 ; -249
Ag(CN)2- ; Ag+ + 2 CN- = Ag(CN)2- ; 20.48 ; -137
Ag(CN)3-2 ; Ag+ + 3 CN- = Ag(CN)3-2 ; 21.7 ; -140
Ag(CN)OH- ; Ag+ + CN- + H2O = Ag(CN)OH- + H+ ; -0.777 ;
Ni(CN)4-2 ; 4 CN- + Ni+2 = Ni(CN)4-2 ; 30.2 ; -180
NiH(CN)4- ; 4 CN- + Ni+2 + H+ = NiH(CN)4- ; 36.0289 ;
NiH3(CN)4+ ; 4 CN- + Ni+2 + 3 H+ = NiH3(CN)4+ ; 43.3434 ;
Fe(CN)6-3 ; 6 CN- + Fe+3 = Fe(CN)6-3 ; 43.6 ; -293
Fe2(CN)6 ; 6 CN- + 2 Fe+3 = Fe2(CN)6 ; 47.6355 ; -218
CaFe(CN)6- ; 6 CN- + Ca+2 + Fe+3 = CaFe(CN)6- ; 46.43 ; -291
KFe(CN)6-2 ; 6 CN- + Fe+3 + K+ = KFe(CN)6-2 ; 45.04 ; -291
HPO4-2 ; PO4-3 + H+ = HPO4-2 ; 12.375 ; -15
H2PO4- ; PO4-3 + 2 H+ = H2PO4- ; 19.573 ; -18
H3PO4 ; PO4-3 + 3 H+ = H3PO4 ; 21.721 ; -10.1
FeH2PO4+2 ; Fe+3 + PO4-3 + 2 H+ = FeH2PO4+2 ; 23.8515 ;
FeHPO4+ ; Fe+3 + PO4-3 + H+ = FeHPO4+ ; 22.292 ; -30.5432
CaHPO4 ; Ca+2 + PO4-3 + H+ = CaHPO4 ; 15.035 ; -3
CaPO4- ; Ca+2 + PO4-3 = CaPO4- ; 6.46 ; 12.9704
CaH2PO4+ ; Ca+2 + PO4-3 + 2 H+ = CaH2PO4+ ; 20.923 ; -6
NaHPO4- ; Na+ + PO4-3 + H+ = NaHPO4- ; 13.445 ;
KHPO4- ; K+ + PO4-3 + H+ = KHPO4- ; 13.255 ;
HCO3- ; CO3-2 + H+ = HCO3- ; 10.329 ; -14.6
H2CO3 ; CO3-2 + 2 H+ = H2CO3 ; 16.681 ; -23.76
Pb(CO3)2-2 ; 2 CO3-2 + Pb+2 = Pb(CO3)2-2 ; 9.938 ;
PbCO3 ; CO3-2 + Pb+2 = PbCO3 ; 6.478 ;
PbHCO3+ ; CO3-2 + Pb+2 + H+ = PbHCO3+ ; 13.2 ;
ZnCO3 ; CO3-2 + Zn+2 = ZnCO3 ; 4.76 ;
ZnHCO3+ ; CO3-2 + Zn+2 + H+ = ZnHCO3+ ; 11.829 ;
HgCO3 ; CO3-2 + Hg+2 = HgCO3 ; 12.078 ;
Hg(CO3)2-2 ; 2 CO3-2 + Hg+2 = Hg(CO3)2-2 ; 15.578 ;
HgHCO3+ ; CO3-2 + Hg+2 + H+ = HgHCO3+ ; 16.348 ;
CdCO3 ; CO3-2 + Cd+2 = CdCO3 ; 4.3578 ;
CdHCO3+ ; CO3-2 + Cd+2 + H+ = CdHCO3+ ; 10.6863 ;
Cd(CO3)2-2 ; 2 CO3-2 + Cd+2 = Cd(CO3)2-2 ; 7.2278 ;
CuCO3 ; CO3-2 + Cu+2 = CuCO3 ; 6.77 ;
CuHCO3+ ; CO3-2 + Cu+2 + H+ = CuHCO3+ ; 12.129 ;
Cu(CO3)2-2 ; 2 CO3-2 + Cu+2 = Cu(CO3)2-2 ; 10.2 ;
NiCO3 ; CO3-2 + Ni+2 = NiCO3 ; 4.5718 ;
NiHCO3+ ; CO3-2 + Ni+2 + H+ = NiHCO3+ ; 12.4199 ;
CaHCO3+ ; CO3-2 + Ca+2 + H+ = CaHCO3+ ; 11.599 ; 5.4
CaCO3 ; CO3-2 + Ca+2 = CaCO3 ; 3.2 ; 16
NaCO3- ; CO3-2 + Na+ = NaCO3- ; 1.27 ; -20.35
NaHCO3 ; CO3-2 + Na+ + H+ = NaHCO3 ; 10.079 ; -28.3301
H2BO3- ; H3BO3 = H2BO3- + H+ ; -9.236 ; 13
H5(BO3)2- ; 2 H3BO3 = H5(BO3)2- + H+ ; -9.306 ; 8.4
H8(BO3)3- ; 3 H3BO3 = H8(BO3)3- + H+ ; -7.306 ; 29.4
AgH2BO3 ; Ag+ + H3BO3 = AgH2BO3 + H+ ; -8.036 ;
CaH2BO3+ ; H3BO3 + Ca+2 = CaH2BO3+ + H+ ; -7.476 ; 17
NaH2BO3 ; H3BO3 + Na+ = NaH2BO3 + H+ ; -9.036 ;
H(Edta)-3 ; Edta-4 + H+ = H(Edta)-3 ; 10.948 ; -23.4304
H2(Edta)-2 ; Edta-4 + 2 H+ = H2(Edta)-2 ; 17.221 ; -41.0032
H3(Edta)- ; Edta-4 + 3 H+ = H3(Edta)- ; 20.34 ; -35.564
H4(Edta) ; Edta-4 + 4 H+ = H4(Edta) ; 22.5 ; -34.3088
H5(Edta)+ ; Edta-4 + 5 H+ = H5(Edta)+ ; 24 ; -32.2168
Pb(Edta)-2 ; Pb+2 + Edta-4 = Pb(Edta)-2 ; 19.8 ; -54.8104
PbH(Edta)- ; Pb+2 + Edta-4 + H+ = PbH(Edta)- ; 23 ;
PbH2(Edta) ; Pb+2 + Edta-4 + 2 H+ = PbH2(Edta) ; 24.9 ;
Al(Edta)- ; Al+3 + Edta-4 = Al(Edta)- ; 19.1 ; 52.7184
AlH(Edta) ; Al+3 + Edta-4 + H+ = AlH(Edta) ; 21.8 ; 36.4008
AlOH(Edta)-2 ; Al+3 + Edta-4 + H2O = AlOH(Edta)-2 + H+ ; 12.8 ; 73.6384
Zn(Edta)-2 ; Zn+2 + Edta-4 = Zn(Edta)-2 ; 18 ; -19.2464
ZnH(Edta)- ; Zn+2 + Edta-4 + H+ = ZnH(Edta)- ; 21.4 ; -28.4512
ZnOH(Edta)-3 ; Zn+2 + Edta-4 + H2O = ZnOH(Edta)-3 + H+ ; 5.8 ;
Cd(Edta)-2 ; Cd+2 + Edta-4 = Cd(Edta)-2 ; 18.2 ; -38.0744
CdH(Edta)- ; Cd+2 + Edta-4 + H+ = CdH(Edta)- ; 21.5 ; -39.748
Hg(Edta)-2 ; Hg+2 + Edta-4 = Hg(Edta)-2 ; 23.106 ; -85.382
HgH(Edta)- ; Hg+2 + Edta-4 + H+ = HgH(Edta)- ; 26.706 ; -88.729
Cu(Edta)-2 ; Cu+2 + Edta-4 = Cu(Edta)-2 ; 20.5 ; -34.7272
CuH(Edta)- ; Cu+2 + Edta-4 + H+ = CuH(Edta)- ; 24 ; -43.0952
CuH2(Edta) ; Cu+2 + Edta-4 + 2 H+ = CuH2(Edta) ; 26.2 ;
CuOH(Edta)-3 ; Cu+2 + Edta-4 + H2O = CuOH(Edta)-3 + H+ ; 8.5 ;
Ag(Edta)-3 ; Ag+ + Edta-4 = Ag(Edta)-3 ; 8.08 ; -31.38
AgH(Edta)-2 ; Ag+ + Edta-4 + H+ = AgH(Edta)-2 ; 15.21 ;
Ni(Edta)-2 ; Ni+2 + Edta-4 = Ni(Edta)-2 ; 20.1 ; -30.9616
NiH(Edta)- ; Ni+2 + Edta-4 + H+ = NiH(Edta)- ; 23.6 ; -38.4928
NiOH(Edta)-3 ; Ni+2 + Edta-4 + H2O = NiOH(Edta)-3 + H+ ; 7.6 ;
Fe(Edta)- ; Fe+3 + Edta-4 = Fe(Edta)- ; 27.7 ; -11.2968
FeH(Edta) ; Fe+3 + Edta-4 + H+ = FeH(Edta) ; 29.2 ; -11.7152
FeOH(Edta)-2 ; Fe+3 + Edta-4 + H2O = FeOH(Edta)-2 + H+ ; 19.9 ;
Fe(OH)2(Edta)-3 ; Fe+3 + Edta-4 + 2 H2O = Fe(OH)2(Edta)-3 + 2 H+ ; 9.85 ;
Ca(Edta)-2 ; Ca+2 + Edta-4 = Ca(Edta)-2 ; 12.42 ; -25.5224
CaH(Edta)- ; Ca+2 + Edta-4 + H+ = CaH(Edta)- ; 15.9 ;
Na(Edta)-3 ; Na+ + Edta-4 = Na(Edta)-3 ; 2.7 ; -5.8576
K(Edta)-3 ; K+ + Edta-4 = K(Edta)-3 ; 1.7 ;
H(Acetate) ; Acetate- + H+ = H(Acetate) ; 4.757 ; 0.41
Pb(Acetate)+ ; Pb+2 + Acetate- = Pb(Acetate)+ ; 2.68 ; -0.4
Pb(Acetate)2 ; Pb+2 + 2 Acetate- = Pb(Acetate)2 ; 4.08 ; -0.8
Zn(Acetate)+ ; Zn+2 + Acetate- = Zn(Acetate)+ ; 1.58 ; 8.3
Zn(Acetate)2 ; Zn+2 + 2 Acetate- = Zn(Acetate)2 ; 2.6434 ; 22
Cd(Acetate)+ ; Cd+2 + Acetate- = Cd(Acetate)+ ; 1.93 ; 9.6
Cd(Acetate)2 ; Cd+2 + 2 Acetate- = Cd(Acetate)2 ; 2.86 ; 15
Hg(Acetate)+ ; Hg+2 + Acetate- = Hg(Acetate)+ ; 4.3 ;
Hg(Acetate)2 ; Hg+2 + 2 Acetate- = Hg(Acetate)2 ; 7.636 ;
Cu(Acetate)+ ; Cu+2 + Acetate- = Cu(Acetate)+ ; 2.21 ; 7.1
Cu(Acetate)2 ; Cu+2 + 2 Acetate- = Cu(Acetate)2 ; 3.4 ; 12
Cu(Acetate)3- ; Cu+2 + 3 Acetate- = Cu(Acetate)3- ; 3.9434 ; 6.2
Ag(Acetate) ; Ag+ + Acetate- = Ag(Acetate) ; 0.73 ; 3
Ag(Acetate)2- ; Ag+ + 2 Acetate- = Ag(Acetate)2- ; 0.64 ; 3
Ni(Acetate)+ ; Ni+2 + Acetate- = Ni(Acetate)+ ; 1.37 ; 8.7
Ni(Acetate)2 ; Ni+2 + 2 Acetate- = Ni(Acetate)2 ; 2.1 ; 10
Fe(Acetate)+2 ; Fe+3 + Acetate- = Fe(Acetate)+2 ; 4.0234 ;
Fe(Acetate)2+ ; Fe+3 + 2 Acetate- = Fe(Acetate)2+ ; 7.5723 ;
Fe(Acetate)3 ; Fe+3 + 3 Acetate- = Fe(Acetate)3 ; 9.5867 ;
Ca(Acetate)+ ; Ca+2 + Acetate- = Ca(Acetate)+ ; 1.18 ; 4
Na(Acetate) ; Na+ + Acetate- = Na(Acetate) ; -0.18 ; 12
K(Acetate) ; K+ + Acetate- = K(Acetate) ; -0.1955 ; 4.184
H(Phthalate)- ; Phthalate-2 + H+ = H(Phthalate)- ; 5.408 ; 2.1757
H2(Phthalate) ; Phthalate-2 + 2 H+ = H2(Phthalate) ; 8.358 ; 4.8534
Pb(Phthalate) ; Pb+2 + Phthalate-2 = Pb(Phthalate) ; 4.26 ;
Pb(Phthalate)2-2 ; Pb+2 + 2 Phthalate-2 = Pb(Phthalate)2-2 ; 4.83 ;
PbH(Phthalate)+ ; Pb+2 + Phthalate-2 + H+ = PbH(Phthalate)+ ; 6.98 ;
Al(Phthalate)+ ; Al+3 + Phthalate-2 = Al(Phthalate)+ ; 4.56 ;
Al(Phthalate)2- ; Al+3 + 2 Phthalate-2 = Al(Phthalate)2- ; 7.2 ;
Zn(Phthalate) ; Zn+2 + Phthalate-2 = Zn(Phthalate) ; 2.91 ; 13.3888
Zn(Phthalate)2-2 ; Zn+2 + 2 Phthalate-2 = Zn(Phthalate)2-2 ; 4.2 ;
Cd(Phthalate) ; Cd+2 + Phthalate-2 = Cd(Phthalate) ; 3.43 ;
CdH(Phthalate)+ ; Cd+2 + Phthalate-2 + H+ = CdH(Phthalate)+ ; 6.3 ;
Cd(Phthalate)2-2 ; Cd+2 + 2 Phthalate-2 = Cd(Phthalate)2-2 ; 3.7 ;
Cu(Phthalate) ; Cu+2 + Phthalate-2 = Cu(Phthalate) ; 4.02 ; 8.368
CuH(Phthalate)+ ; Cu+2 + Phthalate-2 + H+ = CuH(Phthalate)+ ; 7.1 ; 3.8493
Cu(Phthalate)2-2 ; Cu+2 + 2 Phthalate-2 = Cu(Phthalate)2-2 ; 5.3 ; 15.8992
Ni(Phthalate) ; Ni+2 + Phthalate-2 = Ni(Phthalate) ; 2.95 ; 7.5312
NiH(Phthalate)+ ; Ni+2 + Phthalate-2 + H+ = NiH(Phthalate)+ ; 6.6 ;
Ca(Phthalate) ; Ca+2 + Phthalate-2 = Ca(Phthalate) ; 2.45 ;
CaH(Phthalate)+ ; Ca+2 + Phthalate-2 + H+ = CaH(Phthalate)+ ; 6.43 ;
Na(Phthalate)- ; Na+ + Phthalate-2 = Na(Phthalate)- ; 0.8 ; 4.184
K(Phthalate)- ; K+ + Phthalate-2 = K(Phthalate)- ; 0.7 ; 3.7656
Hg(OH)2 ; Hg+2 + 2 H2O = Hg(OH)2 + 2 H+ ; -6.194 ; 39.72
NiH2(CN)4 ; 4 CN- + Ni+2 + 2 H+ = NiH2(CN)4 ; 40.7434 ;
"""

SOLID = """
Mirabilite ; Na2SO4:10H2O(s) = 2 Na+ + SO4-2 + 10 H2O ; -1.114 ; 79.4416
Thenardite ; Na2SO4(s) = 2 Na+ + SO4-2 ; 0.3217 ; -9.121
Galena ; PbS(s) + H+ = Pb+2 + HS- ; -13.97 ; 80
Sphalerite ; ZnS(s) + H+ = HS- + Zn+2 ; -11.45 ; 30
Greenockite ; CdS(s) + H+ = Cd+2 + HS- ; -14.36 ; 55
Cinnabar ; HgS(s) + H+ = Hg+2 + HS- ; -39.5 ; 214.04
Metacinnabar ; HgS(s) + H+ = Hg+2 + HS- ; -38.9 ; 214
Covellite ; CuS(s) + H+ = Cu+2 + HS- ; -22.3 ; 97
Acanthite ; Ag2S(s) + H+ = 2 Ag+ + HS- ; -36.22 ; 227
NiS(alpha) ; NiS(s) + H+ = Ni+2 + HS- ; -5.6 ;
Pb(OH)2 ; Pb(OH)2(s) + 2 H+ = Pb+2 + 2 H2O ; 8.15 ; -58.5342
Al(OH)3(am) ; Al(OH)3(s) + 3 H+ = Al+3 + 3 H2O ; 10.8 ; -111
Zn(OH)2(am) ; Zn(OH)2(s) + 2 H+ = Zn+2 + 2 H2O ; 12.474 ; -80.62
Cd(OH)2 ; Cd(OH)2(s) + 2 H+ = Cd+2 + 2 H2O ; 13.644 ; -94.62
Montroydite ; HgO(s) + 2 H+ = Hg+2 + H2O ; 2.554 ; -78.62
Cu(OH)2 ; Cu(OH)2(s) + 2 H+ = Cu+2 + 2 H2O ; 8.674 ; -56.42
Ag2O ; Ag2O(s) + 2 H+ = 2 Ag+ + H2O ; 12.574 ; -45.62
Ni(OH)2 ; Ni(OH)2(s) + 2 H+ = Ni+2 + 2 H2O ; 12.794 ; -95.96
Ferrihydrite ; Fe(OH)3(s) + 3 H+ = Fe+3 + 3 H2O ; 3.191 ; -73.374
Portlandite ; Ca(OH)2(s) + 2 H+ = Ca+2 + 2 H2O ; 22.804 ; -128.62
Cerargyrite ; AgCl(s) = Ag+ + Cl- ; -9.75 ; 65.2
Cerussite ; PbCO3(s) = CO3-2 + Pb+2 ; -13.13 ; 24.79
Otavite ; CdCO3(s) = CO3-2 + Cd+2 ; -12 ; -0.55
Malachite ; Cu2(OH)2CO3(s) + 2 H+ = CO3-2 + 2 Cu+2 + 2 H2O ; -5.306 ; 76.38
Calcite ; CaCO3(s) = CO3-2 + Ca+2 ; -8.48 ; -8
Anglesite ; PbSO4(s) = Pb+2 + SO4-2 ; -7.79 ; 12
Gypsum ; CaSO4:2H2O(s) = Ca+2 + SO4-2 + 2 H2O ; -4.61 ; 1
Ag3PO4 ; Ag3PO4(s) = 3 Ag+ + PO4-3 ; -17.59 ;
Hydroxylapatite ; Ca5(PO4)3OH(s) + H+ = 5 Ca+2 + 3 PO4-3 + H2O ; -44.333 ;
"""

GAS = """
CO2(g) ; CO2(g) + H2O = CO3-2 + 2 H+ ; -18.147 ; 4.06
H2S(g) ; H2S(g) = HS- + H+ ; -8.01 ;
NH3(g) ; NH3(g) + H+ = NH4+ ; 11.022 ; -86.3996
HCN(g) ; HCN(g) = CN- + H+ ; -8.335 ;
"""

SLOW = {"Cinnabar", "Montroydite", "Hydroxylapatite", "Malachite"}


def _side(text: str, sign: float, into: dict[str, float]) -> None:
    for part in text.split(" + "):
        found = re.fullmatch(r"(?:(\d+(?:\.\d+)?) )?(\S+)", part.strip())
        assert found is not None, part
        token = found[2]
        into[token] = into.get(token, 0.0) + sign * float(found[1] or 1.0)


def equilibrium(name: str, kind: str, reaction: str, log_k: float, enthalpy: float | None = None) -> Equilibrium:
    """The record of one printed row."""
    coefficients: dict[str, float] = {}
    left, right = reaction.split(" = ")
    _side(left, 1.0, coefficients)
    _side(right, -1.0, coefficients)
    (made,) = [token for token in coefficients if token not in COMPONENTS and token != "H2O"]
    share = coefficients.pop(made)  # -1 where formed, +1 where dissolved
    return Equilibrium(
        product=name,
        kind=kind,  # type: ignore[arg-type]
        coefficients={token: -n / share for token, n in coefficients.items()},
        log10_beta=-log_k / share,
        reaction=reaction,
        printed=Value(log_k, "1", "minteq.v4"),
        enthalpy=None if enthalpy is None else Value(enthalpy, "kJ/mol", "minteq.v4"),
        enthalpy_formation=None if enthalpy is None else -enthalpy / share,
    )


def _rows(text: str, kind: str) -> list[Equilibrium]:
    made = []
    for line in text.strip().splitlines():
        name, reaction, log_k, enthalpy = (part.strip() for part in line.split(";"))
        made.append(equilibrium(name, kind, reaction, float(log_k), float(enthalpy) if enthalpy else None))
    return made


EQUILIBRIA: list[Equilibrium] = [*_rows(AQUEOUS, "aqueous"), *_rows(SOLID, "solid"), *_rows(GAS, "gas")]


def species_of(equilibria: list[Equilibrium]) -> dict[str, Species]:
    """Species records for the components and products."""
    made = {
        token: Species(token=token, formula=token, atoms={}, charge=z, phase="aq", component=True)
        for token, z in COMPONENTS.items()
    }
    for row in equilibria:
        z = round(sum(n * COMPONENTS.get(token, 0) for token, n in row.coefficients.items()))
        made[row.product] = Species(
            token=row.product,
            formula=row.product,
            atoms={},
            charge=z,
            phase="aq" if row.kind == "aqueous" else "s" if row.kind == "solid" else "g",
            forms="slow" if row.product in SLOW else "fresh",
        )
    return made


SPECIES = species_of(EQUILIBRIA)
