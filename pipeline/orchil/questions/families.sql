-- Which families do best? Candidates by their rings and the chains between them.
SELECT scaffold(smiles) AS scaffold, min(rank) AS best_rank, count(*) AS candidates,
    avg(absorption_max_nm) AS mean_absorption_max_nm, max(hit_probability) AS best_hit_probability
FROM ranking WHERE rank IS NOT NULL GROUP BY 1 ORDER BY best_rank
