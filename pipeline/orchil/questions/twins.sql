-- Which rows are the same species in the same medium?
SELECT candidate, duplicate_of, medium, smiles FROM ranking WHERE duplicate_of IS NOT NULL ORDER BY row_number
