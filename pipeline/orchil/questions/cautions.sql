-- Which carry a caution? Hazards seen in the structure and doubts about the numbers.
SELECT rank, candidate, cautions FROM ranking WHERE cautions IS NOT NULL ORDER BY rank IS NULL, rank
