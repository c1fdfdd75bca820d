"""Neighbours by reaction."""

import pytest
from rdkit import Chem
from rdkit.Chem import rdChemReactions

from shiftpred.structures.rivals import build_rivals
from shiftpred.structures.rivals.reactions import FURTHER_TABLE_NAME, SMALLEST_SHARE, load_reactions

EXAMPLES = [
    # reaction, starting structure, what is expected; real compounds
    ("ester_to_acid", "CCOC(=O)c1ccccc1", "OC(=O)c1ccccc1"),
    ("ester_to_alcohol", "CC(=O)Oc1ccccc1C(=O)O", "O=C(O)c1ccccc1O"),
    ("lactone_opened", "O=C1OCc2ccccc12", "O=C(O)c1ccccc1CO"),
    ("acid_to_methyl_ester", "O=C(O)c1ccccc1", "COC(=O)c1ccccc1"),
    ("acid_to_ethyl_ester", "O=C(O)c1ccccc1", "CCOC(=O)c1ccccc1"),
    ("methyl_to_ethyl_ester", "COC(=O)c1ccccc1", "CCOC(=O)c1ccccc1"),
    ("ethyl_to_methyl_ester", "CCOC(=O)c1ccccc1", "COC(=O)c1ccccc1"),
    ("ester_reduced", "COC(=O)c1ccccc1", "OCc1ccccc1"),
    ("acid_reduced", "O=C(O)c1ccccc1", "OCc1ccccc1"),
    ("acid_decarboxylated", "O=C(O)c1ccc(O)cc1", "Oc1ccccc1"),
    ("acyl_halide_to_acid", "O=C(Cl)c1ccccc1", "O=C(O)c1ccccc1"),
    ("amide_to_acid", "O=C(Nc1ccccc1)c1ccccc1", "O=C(O)c1ccccc1"),
    ("amide_to_amine", "CC(=O)Nc1ccccc1", "Nc1ccccc1"),
    ("amide_to_cyclic_amine", "CC(=O)N1CCOCC1", "C1COCCN1"),
    ("amide_to_nitrile", "NC(=O)c1ccccc1", "N#Cc1ccccc1"),
    ("nitrile_to_amide", "N#Cc1ccccc1", "NC(=O)c1ccccc1"),
    ("nitrile_to_acid", "N#Cc1ccccc1", "O=C(O)c1ccccc1"),
    ("nitrile_to_aminomethyl", "N#Cc1ccccc1", "NCc1ccccc1"),
    ("sulfonamide_to_amine", "CS(=O)(=O)Nc1ccccc1", "Nc1ccccc1"),
    ("urea_to_amine", "CNC(=O)Nc1ccccc1", "Nc1ccccc1"),
    ("boc_lost", "CC(C)(C)OC(=O)N[C@@H](Cc1ccccc1)C(=O)O", "N[C@@H](Cc1ccccc1)C(=O)O"),
    ("boc_lost_from_azole", "CC(C)(C)OC(=O)n1ccc2ccccc21", "c1ccc2[nH]ccc2c1"),
    ("cbz_lost", "COC(=O)[C@H](C)NC(=O)OCc1ccccc1", "COC(=O)[C@H](C)N"),
    ("fmoc_lost", "O=C(O)[C@H](Cc1ccccc1)NC(=O)OCC1c2ccccc2-c2ccccc21", "N[C@@H](Cc1ccccc1)C(=O)O"),
    ("carbamate_to_amine", "COC(=O)Nc1ccccc1", "Nc1ccccc1"),
    ("silyl_ether_lost", "CC(C)(C)[Si](C)(C)OCCc1ccccc1", "OCCc1ccccc1"),
    ("tosyl_lost", "Cc1ccc(S(=O)(=O)N2CCc3ccccc32)cc1", "c1ccc2c(c1)CCN2"),
    ("sulfonyl_lost_from_azole", "O=S(=O)(c1ccccc1)n1ccc2ccccc21", "c1ccc2[nH]ccc2c1"),
    ("benzyl_lost_from_oxygen", "COc1ccc(OCc2ccccc2)cc1", "COc1ccc(O)cc1"),
    ("benzyl_lost_from_nitrogen", "c1ccc(CN2CCOCC2)cc1", "C1COCCN1"),
    ("thp_lost", "c1ccc(COC2CCCCO2)cc1", "OCc1ccccc1"),
    ("mom_lost", "COCOc1ccccc1", "Oc1ccccc1"),
    ("acetonide_opened", "CC1(C)OCC(CO)O1", "OCC(O)CO"),
    ("dioxolane_to_carbonyl", "CC1(c2ccccc2)OCCO1", "CC(=O)c1ccccc1"),
    ("dialkyl_acetal_to_carbonyl", "COC(OC)c1ccccc1", "O=Cc1ccccc1"),
    ("nitro_reduced", "O=[N+]([O-])c1ccccc1", "Nc1ccccc1"),
    ("amine_from_nitro", "Cc1ccc(N)cc1", "Cc1ccc([N+](=O)[O-])cc1"),
    ("ketone_reduced", "CC(=O)c1ccccc1", "CC(O)c1ccccc1"),
    ("aldehyde_reduced", "O=Cc1ccccc1", "OCc1ccccc1"),
    ("aldehyde_oxidised", "O=Cc1ccccc1", "O=C(O)c1ccccc1"),
    ("secondary_alcohol_oxidised", "CC(O)c1ccccc1", "CC(=O)c1ccccc1"),
    ("primary_alcohol_to_aldehyde", "OCc1ccccc1", "O=Cc1ccccc1"),
    ("primary_alcohol_to_acid", "OCc1ccccc1", "O=C(O)c1ccccc1"),
    ("alcohol_to_chloride", "OCc1ccccc1", "ClCc1ccccc1"),
    ("alcohol_to_bromide", "OCc1ccccc1", "BrCc1ccccc1"),
    ("alkyl_halide_hydrolysed", "BrCc1ccccc1", "OCc1ccccc1"),
    ("alcohol_dehydrated", "CC(O)c1ccccc1", "C=Cc1ccccc1"),
    ("alcohol_acetylated", "OCc1ccccc1", "CC(=O)OCc1ccccc1"),
    ("amine_acetylated", "Nc1ccccc1", "CC(=O)Nc1ccccc1"),
    ("chlorine_to_bromine", "Clc1ccccc1", "Brc1ccccc1"),
    ("chlorine_to_fluorine", "Clc1ccccc1", "Fc1ccccc1"),
    ("chlorine_to_iodine", "Clc1ccccc1", "Ic1ccccc1"),
    ("bromine_to_chlorine", "Brc1ccccc1", "Clc1ccccc1"),
    ("bromine_to_iodine", "Brc1ccccc1", "Ic1ccccc1"),
    ("bromine_to_fluorine", "Brc1ccccc1", "Fc1ccccc1"),
    ("iodine_to_bromine", "Ic1ccccc1", "Brc1ccccc1"),
    ("iodine_to_chlorine", "Ic1ccccc1", "Clc1ccccc1"),
    ("fluorine_to_chlorine", "Fc1ccccc1", "Clc1ccccc1"),
    ("fluorine_to_bromine", "Fc1ccccc1", "Brc1ccccc1"),
    ("halogen_lost", "Cc1ccc(Br)cc1", "Cc1ccccc1"),
    ("fluorine_lost", "CC(=O)c1ccc(F)cc1", "CC(=O)c1ccccc1"),
    ("boronic_acid_to_phenol", "Cc1ccc(B(O)O)cc1", "Cc1ccc(O)cc1"),
    ("boronic_acid_lost", "Cc1ccc(B(O)O)cc1", "Cc1ccccc1"),
    ("pinacol_boronate_to_acid", "Cc1ccc(B2OC(C)(C)C(C)(C)O2)cc1", "Cc1ccc(B(O)O)cc1"),
    ("boronic_ester_lost", "COc1ccc(B2OC(C)(C)C(C)(C)O2)cc1", "COc1ccccc1"),
    ("biaryl_to_bromide", "Cc1ccc(-c2ccccc2)cc1", "Cc1ccc(Br)cc1"),
    ("sulfide_to_sulfoxide", "CSc1ccccc1", "CS(=O)c1ccccc1"),
    ("sulfide_to_sulfone", "CSc1ccccc1", "CS(=O)(=O)c1ccccc1"),
    ("sulfoxide_to_sulfide", "CS(=O)c1ccccc1", "CSc1ccccc1"),
    ("sulfoxide_to_sulfone", "CS(=O)c1ccccc1", "CS(=O)(=O)c1ccccc1"),
    ("sulfone_to_sulfoxide", "CS(=O)(=O)c1ccccc1", "CS(=O)c1ccccc1"),
    ("sulfone_to_sulfide", "CS(=O)(=O)c1ccccc1", "CSc1ccccc1"),
    ("azine_to_oxide", "Cc1ccncc1", "Cc1cc[n+]([O-])cc1"),
    ("azine_oxide_reduced", "Cc1cc[n+]([O-])cc1", "Cc1ccncc1"),
    ("tertiary_amine_to_oxide", "CN1CCOCC1", "C[N+]1([O-])CCOCC1"),
    ("tertiary_amine_oxide_reduced", "C[N+]1([O-])CCOCC1", "CN1CCOCC1"),
    ("alkene_hydrogenated", "C=Cc1ccccc1", "CCc1ccccc1"),
    ("alkyne_to_alkene", "C#Cc1ccccc1", "C=Cc1ccccc1"),
    ("alkyne_to_alkane", "C#Cc1ccccc1", "CCc1ccccc1"),
    ("imine_reduced", "C(=Nc1ccccc1)c1ccccc1", "c1ccc(CNc2ccccc2)cc1"),
    ("imine_to_carbonyl", "CC(=NO)c1ccccc1", "CC(=O)c1ccccc1"),
    ("imine_to_amine", "C(=Nc1ccccc1)c1ccccc1", "Nc1ccccc1"),
    ("aryl_methyl_ether_cleaved", "COc1cc(C)ccc1O", "Cc1ccc(O)c(O)c1"),
    ("phenol_methylated", "Cc1ccc(O)cc1", "COc1ccc(C)cc1"),
    ("aryl_ether_cleaved", "CCCOc1ccccc1", "Oc1ccccc1"),
    ("secondary_amine_methylated", "CNCc1ccccc1", "CN(C)Cc1ccccc1"),
    ("primary_amine_methylated", "NCc1ccccc1", "CNCc1ccccc1"),
    ("amine_methyl_lost", "CN(C)Cc1ccccc1", "CNCc1ccccc1"),
    ("amine_alkyl_lost", "CCN(CC)c1ccccc1", "CCNc1ccccc1"),
    ("amine_ethylated", "CCNc1ccccc1", "CCN(CC)c1ccccc1"),
    ("amine_benzylated", "OCCNCc1ccccc1", "OCCN(Cc1ccccc1)Cc1ccccc1"),
    ("azole_methyl_lost", "Cn1ccc2ccccc21", "c1ccc2[nH]ccc2c1"),
    ("epoxide_opened", "c1ccc(C2CO2)cc1", "OCC(O)c1ccccc1"),
    ("alkene_epoxidised", "C=Cc1ccccc1", "c1ccc(C2CO2)cc1"),
    ("disulfide_cleaved", "CSSCc1ccccc1", "SCc1ccccc1"),
    ("azide_reduced", "[N-]=[N+]=NCc1ccccc1", "NCc1ccccc1"),
    ("thiol_methylated", "Sc1ccccc1", "CSc1ccccc1"),
]


@pytest.mark.parametrize(("name", "smiles", "expected"), EXAMPLES, ids=[example[0] for example in EXAMPLES])
def test_reaction_makes_its_neighbour(name, smiles, expected):
    reaction = next(reaction for reaction in load_reactions() if reaction.name == name)
    products = set()
    for product_set in reaction.transform.RunReactants((Chem.MolFromSmiles(smiles),)):
        for product in product_set:
            Chem.SanitizeMol(product)
            products.add(Chem.MolToSmiles(product))
    assert Chem.CanonSmiles(expected) in products


def test_every_reaction_of_the_table_has_an_example():
    assert {reaction.name for reaction in load_reactions()} == {name for name, *_ in EXAMPLES}


def test_the_table_is_sound():
    for reaction in load_reactions():
        assert reaction.transform.GetNumReactantTemplates() == 1, reaction.name
        warnings, errors = reaction.transform.Validate(silent=True)
        assert errors == 0, reaction.name
        assert isinstance(reaction.transform, rdChemReactions.ChemicalReaction)
        assert reaction.how and reaction.how[0] not in "*["
        assert -0.5 <= reaction.penalty <= 0.5


def test_lost_boc_is_near_and_mass_rules_it_out():
    mol = Chem.MolFromSmiles("CC(C)(C)OC(=O)N[C@@H](Cc1ccccc1)C(=O)O")
    how = {rival.smiles: rival.how for rival in build_rivals(mol, 9)}
    assert how[Chem.CanonSmiles("N[C@@H](Cc1ccccc1)C(=O)O")] == "Boc lost"
    assert all(rival.kind in ("isomer", "stereoisomer") for rival in build_rivals(mol, 50, mass_confirmed=True))


def test_small_fragments_are_no_rivals():
    # ethanol is no rival of ethyl benzoate
    rivals = build_rivals(Chem.MolFromSmiles("CCOC(=O)c1ccccc1"), 100)
    assert min(Chem.MolFromSmiles(rival.smiles).GetNumAtoms() for rival in rivals) >= SMALLEST_SHARE * 11


FURTHER_EXAMPLES = [
    ("ring_methylated", "c1ccccc1", "Cc1ccccc1"),
    ("ring_methyl_missing", "Cc1ccc(C)cc1", "Cc1ccccc1"),
    ("ring_chlorinated", "c1ccccc1", "Clc1ccccc1"),
    ("ring_brominated", "c1ccccc1", "Brc1ccccc1"),
    ("ring_nitrated", "c1ccccc1", "O=[N+]([O-])c1ccccc1"),
    ("nitro_missing", "O=C(O)c1cccc([N+](=O)[O-])c1", "O=C(O)c1ccccc1"),
    ("ring_hydroxylated", "O=C(O)c1ccccc1", "O=C(O)c1ccccc1O"),
    ("chain_longer", "CCOC(C)=O", "CCCOC(C)=O"),
    ("chain_shorter", "CCCOC(C)=O", "CCOC(C)=O"),
    ("benzyl_position_oxidised", "CCc1ccccc1", "CC(=O)c1ccccc1"),
    ("methyl_oxidised", "Cc1ccccc1", "O=C(O)c1ccccc1"),
    ("diaryl_ether_missing", "c1ccc(Oc2ccccc2)cc1", "Oc1ccccc1"),
    ("phosphine_oxidised", "c1ccc(P(c2ccccc2)c2ccccc2)cc1", "O=P(c1ccccc1)(c1ccccc1)c1ccccc1"),
    ("phosphine_oxide_reduced", "O=P(c1ccccc1)(c1ccccc1)c1ccccc1", "c1ccc(P(c2ccccc2)c2ccccc2)cc1"),
    ("phosphorus_ester_hydrolysed", "CCOP(=O)(OCC)OCC", "CCOP(=O)(O)OCC"),
    ("sulfonyl_missing", "Cc1ccc(S(N)(=O)=O)cc1", "Cc1ccccc1"),
]


@pytest.mark.parametrize(("name", "smiles", "expected"), FURTHER_EXAMPLES, ids=[e[0] for e in FURTHER_EXAMPLES])
def test_every_further_reaction_gives_its_product(name, smiles, expected):
    reaction = next(r for r in load_reactions(FURTHER_TABLE_NAME) if r.name == name)
    products = set()
    for (product,) in reaction.transform.RunReactants((Chem.MolFromSmiles(smiles),)):
        Chem.SanitizeMol(product)
        products.add(Chem.MolToSmiles(product))
    assert Chem.CanonSmiles(expected) in products


def test_every_further_reaction_has_an_example():
    assert {r.name for r in load_reactions(FURTHER_TABLE_NAME)} == {e[0] for e in FURTHER_EXAMPLES}


def test_further_reactions_come_last_and_only_where_the_mass_is_open():
    stilbene = Chem.MolFromSmiles("C(=C/c1ccccc1)\\c1ccccc1")
    how = [r.how for r in build_rivals(stilbene, 12)]
    assert how[0] == "Z instead of E at a double bond"
    assert "one methyl more on the ring" in how and how.index("one methyl more on the ring") >= 3
    confirmed = build_rivals(stilbene, 12, mass_confirmed=True)
    assert all(r.kind != "reaction" for r in confirmed)
    drug = Chem.MolFromSmiles("CCN(CC)CC(=O)Nc1c(C)cccc1C")
    further = {r.how for r in load_reactions(FURTHER_TABLE_NAME)}
    assert not further & {r.how for r in build_rivals(drug, 20)}
