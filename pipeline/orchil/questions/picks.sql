-- What should we make? The diverse choice, with how probable a full hit is.
SELECT pick, rank, candidate, smiles, medium, absorption_low_nm, absorption_max_nm, absorption_high_nm,
    molar_absorptivity, hit_probability, cautions
FROM ranking WHERE pick IS NOT NULL ORDER BY pick
