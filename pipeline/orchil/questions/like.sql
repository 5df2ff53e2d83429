-- What in the library is like this structure? Tanimoto coefficient of Morgan fingerprints.
-- :smiles = CN(C)c1ccc(/N=N/c2ccccc2)cc1; structure to compare with
-- :count = 10; how many to list
SELECT similarity(smiles, :smiles) AS similarity, rank, candidate, smiles, absorption_max_nm, hit_probability
FROM ranking WHERE smiles IS NOT NULL ORDER BY similarity DESC, rank IS NULL, rank LIMIT :count
