"""What does the next calculation need?"""
