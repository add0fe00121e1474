"""What must give: collisions, ladders, prices, frontiers and the ledger."""
