-- Why does each of the best stand where it does? Every want with its probability and its share of the loss.
-- :best = 10; how far down the ranking
SELECT r.rank, r.candidate, w.quantity, w.value, w.probability, w.weight, w.contribution AS share_of_loss
FROM want_result w
JOIN candidate c ON c.id = w.candidate_id
JOIN ranking r ON r.row_number = c.row_number
WHERE w.screen_id = (SELECT id FROM screen ORDER BY active_at DESC LIMIT 1) AND r.rank <= :best
ORDER BY r.rank, w.position
