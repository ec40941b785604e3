"""How fast does the water run through the gap?"""
