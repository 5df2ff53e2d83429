-- Which contain this group? A substructure as SMARTS; the default is a nitro group.
-- :smarts = [N+](=O)[O-]; pattern that must be there
SELECT rank, candidate, smiles, absorption_max_nm, molar_absorptivity, hit_probability
FROM ranking WHERE has_substructure(smiles, :smarts) = 1 ORDER BY rank IS NULL, rank
