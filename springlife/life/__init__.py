"""The judgement: the case, damage, findings, life."""
