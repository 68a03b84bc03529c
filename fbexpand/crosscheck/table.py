"""stub"""
def table_function(profile, expansion):
    return None
