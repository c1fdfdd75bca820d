"""Ten cases from the bench, through the public door, with the shipped model.

Shifts are from memory (± 0.3 ppm 13C, ± 0.05 ppm 1H), in CDCl3 unless said; the ethyl acetate lines are published (Fulmer et al.,
Organometallics 2010, 29, 2176; Gottlieb, Kotlyar & Nudelman, J. Org. Chem. 1997, 62, 7512).
"""

import pytest

import shiftpred
from shiftpred.errors import InputError, PeakError
from shiftpred.pipeline import rank_structures

ETHYL_ACETATE = (171.36, 60.49, 21.04, 14.19)


def compare(structure, c13=None, h1=None, solvent="CDCl3", **settings):
    return shiftpred.compare(structure, c13=c13, h1=h1, solvent=solvent, **settings)


def leftovers(found, nucleus="13C"):
    return {u.observed_ppm: u.likely for u in found.unexplained if u.nucleus == nucleus}


# 1. Ethyl benzoate, wet with ethyl acetate.

BENZOATE = "166.6, 132.8, 130.5, 129.5 (2C), 128.3 (2C), 60.9, 14.3"


def test_ethyl_benzoate_wet_with_ethyl_acetate():
    found = compare("CCOC(=O)c1ccccc1", f"{BENZOATE}, 171.36, 60.49, 21.04, 14.19")
    assert found.judgement == "supported"
    assert leftovers(found) == dict.fromkeys(ETHYL_ACETATE, "ethyl acetate")
    assert {a.observed_ppm for a in found.assignments} == {166.6, 132.8, 130.5, 129.5, 128.3, 60.9, 14.3}


@pytest.mark.parametrize("left_out", [171.36, 21.04])
def test_three_lines_of_ethyl_acetate_are_not_ethyl_acetate(left_out):
    some = ", ".join(str(x) for x in ETHYL_ACETATE if x != left_out)
    found = compare("CCOC(=O)c1ccccc1", f"{BENZOATE}, {some}")
    assert "ethyl acetate" not in leftovers(found).values()


def test_the_same_list_contradicts_phenyl_propanoate():
    found = compare("CCC(=O)Oc1ccccc1", f"{BENZOATE}, 171.36, 60.49, 21.04, 14.19")
    assert found.judgement == "contradicted"
    reasons = "\n".join(found.reasons)
    assert any(f"nothing near {x}" in reasons for x in (148, 149, 150, 151, 152)), "the ipso C-O"
    assert 60.9 in leftovers(found) and leftovers(found)[60.9] is None
    assert found.rivals[0].smiles == "CCOC(=O)c1ccccc1"


# 2. 4'-Fluoroacetophenone, 101 MHz.

SPLIT_TEXT = "196.5, 165.7 (d, J = 254 Hz), 133.6 (d, J = 3 Hz), 130.9 (d, J = 9 Hz, 2C), 115.6 (d, J = 22 Hz, 2C), 26.5"
SPLIT_LINES = [196.5, 166.96, 164.44, 133.61, 133.59, 130.94, 130.86, 115.71, 115.49, 26.5]
PARA, META, ORTHO = "CC(=O)c1ccc(F)cc1", "CC(=O)c1cccc(F)c1", "CC(=O)c1ccccc1F"
BOTH_WAYS = pytest.mark.parametrize(
    ("peaks", "settings"), [(SPLIT_TEXT, {}), (SPLIT_LINES, {"frequency_mhz": 101})], ids=["journal text", "ten lines"]
)


@BOTH_WAYS
def test_fluoroacetophenone(peaks, settings):
    found = compare(PARA, peaks, **settings)
    assert found.judgement == "supported"
    assert leftovers(found) == {}
    carbon = {a.atom: a for a in found.assignments}[7]
    assert carbon.observed_ppm == pytest.approx(165.7, abs=0.01)


@BOTH_WAYS
def test_the_wrong_fluoroacetophenone_does_not_win_by_its_number_of_lines(peaks, settings):
    assert compare(META, peaks, **settings).judgement == "contradicted"
    assert list(shiftpred.rank([META, ORTHO, PARA], c13=peaks, solvent="CDCl3", **settings).candidate)[0] == 2


# 3. Paracetamol.

PARACETAMOL, PARACETAMOL_C13 = "CC(=O)Nc1ccc(O)cc1", "167.6, 153.1, 131.0, 120.8 (2C), 115.0 (2C), 23.7"
PARACETAMOL_H1 = "9.65, 9.14, 7.34 (2H), 6.68 (2H), 1.98 (3H), 2.50, 3.33"


def test_paracetamol_in_dmso():
    found = compare(PARACETAMOL, PARACETAMOL_C13, PARACETAMOL_H1, solvent="DMSO-d6")
    assert found.judgement == "supported"
    labile = {a.atom: a.interchangeable for a in found.assignments if a.nucleus == "1H" and a.atom in (4, 9)}
    assert labile == {4: (9,), 9: (4,)}
    assert leftovers(found, "1H") == {2.5: "solvent DMSO-d6", 3.33: "water"}


def test_paracetamol_in_methanol_has_no_labile_hydrogens():
    found = compare(PARACETAMOL, PARACETAMOL_C13, "7.34 (2H), 6.68 (2H), 1.98 (3H)", solvent="CD3OD")
    assert found.judgement == "supported"
    assert {m.atom for m in found.missing} == {4, 9} and all("exchanges" in m.note for m in found.missing)


def test_methyl_aminobenzoate_is_not_paracetamol():
    assert compare("COC(=O)c1ccc(N)cc1", PARACETAMOL_C13, PARACETAMOL_H1, solvent="DMSO-d6").judgement == "contradicted"


# 4. N or O.


def test_methyl_on_nitrogen_instead_of_oxygen():
    found = compare("COc1ccccn1", [162.5, 139.6, 138.5, 120.2, 105.9, 37.4])
    assert found.judgement == "contradicted"
    assert found.rivals[0].smiles == "Cn1ccccc1=O"
    assert any("37.4" in r for r in found.reasons)


# 5. Creosol or its isomer.

CREOSOL, ISOMER = "COc1cc(C)ccc1O", "COc1ccc(C)cc1O"
CREOSOL_C13 = [146.3, 143.4, 129.6, 121.5, 114.1, 111.6, 55.8, 21.0]


def test_creosol_and_what_would_decide():
    found = compare(CREOSOL, CREOSOL_C13)
    assert found.judgement != "contradicted"
    other = next(r for r in found.rivals if r.smiles == ISOMER)
    assert "NOE from O-CH3" in other.decided_by
    before, after = other.decided_by.split("in the proposal")
    assert "about 2 Hz" in before and "about 8 Hz" in after
    if found.judgement == "open":
        assert found.reason_code == "rival_fits" and ISOMER in found.reasons[0]


def test_the_isomer_of_creosol_is_not_supported():
    found = compare(ISOMER, CREOSOL_C13)
    assert found.judgement != "supported"
    assert found.rivals[0].smiles == CREOSOL


# 6. N,N-Dimethylformamide.


def test_dimethylformamide_has_two_methyl_lines():
    found = compare("CN(C)C=O", [162.6, 36.5, 31.4], [8.02, 2.96, 2.88])
    assert found.judgement == "supported"
    assert not found.unexplained and not found.missing


# 7. A regioisomer that needs no doubt.

NITRO = {
    "COC(=O)c1cccc([N+](=O)[O-])c1": [164.9, 148.2, 135.2, 131.8, 129.6, 127.3, 124.5, 52.7],
    "COC(=O)c1ccc([N+](=O)[O-])cc1": [165.2, 150.5, 135.5, 130.7, 123.5, 52.8],
}


@pytest.mark.parametrize("structure", NITRO)
@pytest.mark.parametrize("measured", NITRO)
def test_methyl_nitrobenzoates(structure, measured):
    found = compare(structure, NITRO[measured])
    if structure == measured:
        assert found.judgement == "supported"
    else:
        assert found.judgement == "contradicted"


# 8. Far off.

ASPIRIN, ASPIRIN_C13 = "CC(=O)Oc1ccccc1C(=O)O", [170.2, 169.8, 151.3, 134.9, 132.5, 126.2, 124.0, 122.2, 21.0]
CAFFEINE, CAFFEINE_C13 = "Cn1cnc2c1c(=O)n(C)c(=O)n2C", [155.3, 151.6, 148.6, 141.4, 107.5, 33.5, 29.7, 27.9]


@pytest.mark.parametrize(("structure", "peaks"), [(ASPIRIN, CAFFEINE_C13), (CAFFEINE, ASPIRIN_C13)])
def test_far_off(structure, peaks):
    assert compare(structure, peaks).judgement == "contradicted"


@pytest.mark.parametrize(("structure", "peaks"), [(ASPIRIN, ASPIRIN_C13), (CAFFEINE, CAFFEINE_C13)])
def test_and_the_right_way_round(structure, peaks):
    assert compare(structure, peaks).judgement == "supported"


# 9. A 1H spectrum picked line by line.

ETHYL_ACETATE_H1 = "4.152, 4.134, 4.116, 4.098; 2.045; 1.276, 1.258, 1.240"


def test_lines_are_grouped_with_the_frequency():
    found = compare("CCOC(C)=O", h1=ETHYL_ACETATE_H1, frequency_mhz=400)
    assert len(found.peaks["1H"].peaks) == 3
    assert {round(a.observed_ppm, 3) for a in found.assignments} == {4.125, 2.045, 1.258}
    assert sum("read as one" in c for c in found.cautions) == 2


def test_without_the_frequency_it_is_asked_for():
    with pytest.raises(PeakError, match="--frequency"):
        compare("CCOC(C)=O", h1=ETHYL_ACETATE_H1)


# 10. Half an archive.


def test_a_sample_without_a_carbon_list():
    found = compare("CCOC(C)=O", h1="4.12 (q, J = 7.1 Hz, 2H), 2.05 (s, 3H), 1.26 (t, J = 7.1 Hz, 3H)")
    assert any("no 13C list" in c for c in found.cautions)


def test_a_sample_without_any_list_or_structure():
    with pytest.raises(InputError, match="no peaks"):
        compare("CCO")
    with pytest.raises(InputError):
        compare("", [57.8, 18.2])


def test_hydrogen_shifts_given_as_carbon():
    with pytest.raises(InputError, match="1H"):
        compare("CCOC(C)=O", [4.12, 2.05, 1.26])


def test_a_sodium_salt_in_heavy_water():
    # sodium benzoate in D2O, from memory
    found = compare("[Na+].[O-]C(=O)c1ccccc1", [175.6, 136.4, 131.3, 128.9, 128.4], solvent="D2O")
    assert found.judgement in ("supported", "open")
    assert any("salt" in c for c in found.cautions)


# Besides: the same input always gives the same judgement.


def test_the_same_twice():
    first, second = (compare(CREOSOL, CREOSOL_C13).to_dict() for _ in range(2))
    assert first == second


def test_rank_keeps_the_input_positions():
    found = rank_structures(["CCC(=O)Oc1ccccc1", "not a structure(", "CCOC(=O)c1ccccc1"], c13=BENZOATE, solvent="CDCl3")
    assert [c.candidate for c in found.candidates] == [2, 0]
    assert len(found.failures) == 1
    assert found.candidates[0].probability > 0.8 > found.candidates[1].probability
    assert sum(c.probability for c in found.candidates) + found.none_of_these == pytest.approx(1.0)
