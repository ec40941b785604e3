"""What does the bed feel at the end of the protection?"""
